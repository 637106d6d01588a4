/** The description part of an uploaded table, for the document: crystals/upload reads it, and CrystalTableIn has the last word. */
import { z } from 'zod';
import { AxisNumbers, tableFields } from './crystal.ts';

const DatasetPath = z.string().min(1).max(1000);

const axis = (what: string) =>
  z
    .strictObject({
      unit: z.string().max(64).optional(),
      edges: AxisNumbers.optional(),
      points: AxisNumbers.optional(),
      dataset: DatasetPath.optional().meta({ description: 'HDF5: where the file has this axis.' }),
    })
    .optional()
    .meta({
      description:
        `${what} As in a table in JSON. Without edges and points the numbers come from the file: out of a dataset, or the first ` +
        'row and column of a text. The unit may come from there too, as in a heading "momentum (keV)".',
    });

const {
  formFactorSquared: _formFactor,
  lossFunction: _loss,
  dielectricFunction: _epsilon,
  ...said
} = tableFields.shape;

export const CrystalUpload = z
  .strictObject({
    ...said,
    momentum: axis('Momentum transfer.'),
    energy: axis('Energy transfer.'),
    quantity: z
      .enum(['formFactorSquared', 'lossFunction'])
      .default('formFactorSquared')
      .meta({ description: 'What the values are.' }),
    dataset: DatasetPath.optional().meta({
      description: 'HDF5: where the file has the values; not needed where it has one dataset of two dimensions.',
    }),
  })
  .meta({ id: 'CrystalUpload', description: 'A table without its values, which are in a file.' });
