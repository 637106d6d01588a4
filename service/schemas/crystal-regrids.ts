/** POST /v1/crystals/{id}/regrids: the same table with fewer cells. */
import { z } from 'zod';

const cells = z.int().min(2).max(100_000);

export const CrystalRegrid = z
  .strictObject({
    momentumCells: cells.optional().meta({ description: 'At most about as many; default: as many as there are.' }),
    energyCells: cells.optional().meta({ description: 'At most about as many; default: as many as there are.' }),
  })
  .superRefine(({ momentumCells, energyCells }, context) => {
    if (momentumCells !== undefined || energyCells !== undefined) return;
    context.addIssue({ code: 'custom', message: 'needs "momentumCells", "energyCells" or both' });
  })
  .meta({
    id: 'CrystalRegridRequest',
    description: 'Neighbouring cells are merged in equal numbers; the band gap stays between two cells.',
  });
export type CrystalRegrid = z.output<typeof CrystalRegrid>;
