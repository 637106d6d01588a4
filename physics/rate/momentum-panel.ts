/**
 * Product integration over momentum. The rate is ∫ dq Σ_j f(q, E_j) φ_j(q): the table f jumps or bends at every grid line, but
 * φ — halo, kinematics and mediator — is smooth over a few per cent of q. So q is cut into panels that need not respect the
 * grid; in a panel φ is the polynomial through five nodes (Clenshaw–Curtis points), and the table enters exactly, through its
 * moments
 *
 *   m_kj = ∫_panel f(q, E_j) ℓ_k(q) dq,    ∫_panel f φ_j dq ≈ Σ_k m_kj φ_j(q_k)
 *
 * with ℓ_k the Lagrange polynomials of the nodes. The moments know nothing of mass, mediator or halo.
 */
import type { CrystalTable } from '../crystal/crystal-table.ts';
import { columnsOf } from '../crystal/crystal-table.ts';
import { gaussLegendre } from '../numeric/gauss-legendre.ts';
import { intervalOf } from '../numeric/interval.ts';

export const NODES = 5;
/** The nodes on [0, 1]; the first, third and fifth alone define the quadratic that the error estimate compares with. */
const UNIT_NODES = [0, (1 - Math.SQRT1_2) / 2, 0.5, (1 + Math.SQRT1_2) / 2, 1];

export interface MomentumPanel {
  readonly fromEv: number;
  readonly toEv: number;
  /** The five momenta at which φ is wanted, eV. */
  readonly nodesEv: readonly number[];
  /** m_kj at [k · columns + j], in the table's unit times eV. */
  readonly moments: Float64Array;
}

/** ℓ_k(t), t in [0, 1], as an array over k. */
function lagrange(t: number): number[] {
  return UNIT_NODES.map((own, k) =>
    UNIT_NODES.reduce((product, other, i) => (i === k ? product : (product * (t - other)) / (own - other)), 1),
  );
}

/** Coefficients of the quadratic through nodes 0, 2, 4 at nodes 1 and 3: what φ₁ and φ₃ are compared with. */
export const QUADRATIC_AT: readonly (readonly [number, number, number])[] = [UNIT_NODES[1], UNIT_NODES[3]].map((t) => [
  2 * (t - 0.5) * (t - 1),
  -4 * t * (t - 1),
  2 * t * (t - 0.5),
]);

/** Three nodes integrate ℓ_k (degree 4) times a linear table exactly. */
const RULE = gaussLegendre(3);

/** Rows are added a few at a time: the moments are then read and written once for all of them. */
const ROWS_AT_ONCE = 4;

/** The panel [fromEv, toEv], which must lie within the table's momentum axis. Cost: five multiplications a table cell. */
function computePanel(table: CrystalTable, fromEv: number, toEv: number): MomentumPanel {
  const stride = columnsOf(table);
  const moments = new Float64Array(NODES * stride);
  const rows = rowWeights(table, fromEv, toEv);
  while (rows.length % ROWS_AT_ONCE !== 0) rows.push({ row: rows[0].row, weights: new Array(NODES).fill(0) });
  for (let r = 0; r < rows.length; r += ROWS_AT_ONCE) {
    const [a, b, c, d] = rows
      .slice(r, r + ROWS_AT_ONCE)
      .map(({ row }) => table.values.subarray(row * stride, (row + 1) * stride));
    for (let k = 0; k < NODES; k++) {
      const [wa, wb, wc, wd] = rows.slice(r, r + ROWS_AT_ONCE).map(({ weights }) => weights[k]);
      const moment = moments.subarray(k * stride, (k + 1) * stride);
      for (let j = 0; j < moment.length; j++) moment[j] += wa * a[j] + wb * b[j] + wc * c[j] + wd * d[j];
    }
  }
  return { fromEv, toEv, nodesEv: UNIT_NODES.map((t) => (t === 1 ? toEv : fromEv + (toEv - fromEv) * t)), moments };
}

/** The table's rows that the panel meets, each with its five weights: the integrals of ℓ_k over what the row covers. */
function rowWeights(table: CrystalTable, fromEv: number, toEv: number): { row: number; weights: number[] }[] {
  const axis = table.momentumEv;
  const linear = table.axes === 'points';
  const rows: { row: number; weights: number[] }[] = [];
  const first = intervalOf(axis, fromEv);
  for (let i = first; i < axis.length - 1 && axis[i] < toEv; i++) {
    const a = Math.max(fromEv, axis[i]);
    const b = Math.min(toEv, axis[i + 1]);
    const here = rows.find(({ row }) => row === i)?.weights ?? new Array<number>(NODES).fill(0);
    const next = new Array<number>(NODES).fill(0);
    if (rows.at(-1)?.row !== i) rows.push({ row: i, weights: here });
    if (linear) rows.push({ row: i + 1, weights: next });
    for (let g = 0; g < RULE.nodes.length; g++) {
      const q = (a + b) / 2 + ((b - a) / 2) * RULE.nodes[g];
      const weight = (RULE.weights[g] * (b - a)) / 2;
      const share = linear ? (q - axis[i]) / (axis[i + 1] - axis[i]) : 0;
      const basis = lagrange((q - fromEv) / (toEv - fromEv));
      for (let k = 0; k < NODES; k++) {
        here[k] += weight * basis[k] * (1 - share);
        next[k] += weight * basis[k] * share;
      }
    }
  }
  return rows;
}

/** Panels of a table that are kept: they serve every mass, mediator and halo. */
const MOST_BYTES_A_TABLE = 16 * 2 ** 20;
const panels = new WeakMap<CrystalTable, Map<string, MomentumPanel>>();

/** The panel [fromEv, toEv], which must lie within the table's momentum axis; computed once for each table. */
export function momentumPanel(table: CrystalTable, fromEv: number, toEv: number): MomentumPanel {
  const known = panels.get(table) ?? new Map<string, MomentumPanel>();
  panels.set(table, known);
  const key = `${fromEv} ${toEv}`;
  const panel = known.get(key) ?? computePanel(table, fromEv, toEv);
  known.delete(key);
  known.set(key, panel); // most recently used last
  if (known.size * panel.moments.byteLength > MOST_BYTES_A_TABLE) known.delete(known.keys().next().value!);
  return panel;
}

/** Ratio of neighbouring lattice momenta: a panel is 7 % of its momentum wide. */
const LATTICE_RATIO = 1.07;

/** The k-th lattice momentum, eV. The lattice is the same for every table, mass and halo. */
function latticeEv(k: number): number {
  return LATTICE_RATIO ** k;
}

/** Panel boundaries from fromEv to toEv: lattice momenta in between, the two ends as they are. */
export function panelBoundariesEv(fromEv: number, toEv: number): number[] {
  const boundaries = [fromEv];
  for (let k = Math.floor(Math.log(fromEv) / Math.log(LATTICE_RATIO)); ; k++) {
    const q = latticeEv(k);
    if (q >= toEv) break;
    if (q > fromEv * (1 + 1e-12)) boundaries.push(q);
  }
  boundaries.push(toEv);
  return boundaries;
}
