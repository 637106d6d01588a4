/** Which in-medium screening the rates are to have. */
import { z } from 'zod';

export const Screening = z
  .enum(['as-given', 'none', 'in-medium'])
  .default('as-given')
  .meta({
    description:
      'as-given: the numbers of the table as they are. none: without screening; refused for a table that has it in its numbers. ' +
      'in-medium: with it; where the table has none, |f|²/|ε|² is used with ε from the table itself by Kramers–Kronig, and a notice says so.',
  });
export type Screening = z.output<typeof Screening>;
