/** Which interval of an axis a number lies in. */

/**
 * Index i of the interval [axis[i], axis[i + 1]) that holds x, by halving; x outside the axis goes to the first or last interval,
 * the axis's own end to the last. The axis: at least two numbers, strictly increasing.
 */
export function intervalOf(axis: ArrayLike<number>, x: number): number {
  let low = 0;
  let high = axis.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (axis[middle] <= x) low = middle;
    else high = middle;
  }
  return low;
}
