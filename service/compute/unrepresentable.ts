/** Numbers beyond what a double holds. */
import { invalidInput, type Problem } from '../problem.ts';

/** Inputs may each be sensible and their product beyond what a number holds; that is said, not answered with null. */
export function unrepresentable(): Problem {
  return invalidInput([
    { pointer: '', detail: 'the numbers are so large or so small that the rate cannot be represented' },
  ]);
}
