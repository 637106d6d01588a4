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

/** Index i of the interval [axis[i], axis[i + 1]) that holds x; clamped to the axis. */
export function intervalOf(axis: Float64Array, x: number): number {
  let low = 0;
  let high = axis.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (axis[middle] <= x) low = middle;
    else high = middle;
  }
  return low;
}

/**
 * The panel [fromEv, toEv], which must lie within the table's momentum axis. Columns from `columns.end` on are not needed and
 * left at zero. Cost: five multiplications a table cell.
 */
export function momentumPanel(
  table: CrystalTable,
  fromEv: number,
  toEv: number,
  columns: { readonly start: number; readonly end: number } = { start: 0, end: columnsOf(table) },
): MomentumPanel {
  const width = toEv - fromEv;
  const stride = columnsOf(table);
  const moments = new Float64Array(NODES * stride);
  const axis = table.momentumEv;
  const addRow = (row: number, w: readonly number[]): void => {
    const [w0, w1, w2, w3, w4] = w;
    const values = table.values;
    for (let j = columns.start, v = row * stride + columns.start; j < columns.end; j++, v++) {
      const f = values[v];
      moments[j] += w0 * f;
      moments[stride + j] += w1 * f;
      moments[2 * stride + j] += w2 * f;
      moments[3 * stride + j] += w3 * f;
      moments[4 * stride + j] += w4 * f;
    }
  };
  for (let i = intervalOf(axis, fromEv); i < axis.length - 1 && axis[i] < toEv; i++) {
    const a = Math.max(fromEv, axis[i]);
    const b = Math.min(toEv, axis[i + 1]);
    if (!(b > a)) continue;
    const here = [0, 0, 0, 0, 0];
    const next = [0, 0, 0, 0, 0];
    for (let g = 0; g < RULE.nodes.length; g++) {
      const q = (a + b) / 2 + ((b - a) / 2) * RULE.nodes[g];
      const weight = (RULE.weights[g] * (b - a)) / 2;
      const share = table.axes === 'points' ? (q - axis[i]) / (axis[i + 1] - axis[i]) : 0;
      const basis = lagrange((q - fromEv) / width);
      for (let k = 0; k < NODES; k++) {
        here[k] += weight * basis[k] * (1 - share);
        next[k] += weight * basis[k] * share;
      }
    }
    addRow(i, here);
    if (table.axes === 'points') addRow(i + 1, next);
  }
  return { fromEv, toEv, nodesEv: UNIT_NODES.map((t) => (t === 1 ? toEv : fromEv + width * t)), moments };
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
