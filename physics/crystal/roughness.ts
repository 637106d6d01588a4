/**
 * Noise from cell to cell, as a sampled calculation leaves it. Second differences along energy remove what is straight; for
 * independent errors of relative size r, (f_{j−1} − 2 f_j + f_{j+1})/√6 has standard deviation r f, and the median of |x| of a
 * normal distribution is 0.6745 of its standard deviation.
 */
import { median } from '../numeric/median.ts';
import { type CrystalTable, columnsOf, rowsOf } from './crystal-table.ts';

const MEDIAN_OF_NORMAL = 0.6745;
/** Second differences looked at: enough for the median to be known to 1 %. */
const MOST_SAMPLES = 50_000;

/**
 * Relative noise of a value, estimated as the median over triples of neighbours in energy that are all above 0 and above the gap.
 * Curvature counts as noise where cells are wide, and neighbours smoothed together hide theirs: an estimate, to a factor 2.
 * 0 where there are no triples.
 */
export function cellNoise(table: CrystalTable, bandGapEv: number): number {
  const { values, energyEv } = table;
  const columns = columnsOf(table);
  const first = energyEv.findIndex((e) => e >= bandGapEv);
  if (first < 0) return 0;
  const stride = Math.max(1, Math.floor(values.length / MOST_SAMPLES));
  const relative: number[] = [];
  for (let at = 0; at < rowsOf(table) * columns; at += stride) {
    const j = at % columns;
    if (j <= first || j >= columns - 1) continue;
    const [before, own, after] = [values[at - 1], values[at], values[at + 1]];
    if (before > 0 && own > 0 && after > 0)
      relative.push(Math.abs(before - 2 * own + after) / (Math.sqrt(6) * ((before + own + after) / 3)));
  }
  return median(relative) / MEDIAN_OF_NORMAL;
}
