/** What an answer depends on, so that two answers can be compared. */
import { createHash } from 'node:crypto';
import canonicalize from 'canonicalize';
import type { z } from 'zod';
import { CODATA_YEAR } from '../physics/constants.ts';
import type { Provenance } from './schemas/rates.ts';

/** `request` is the input as it was understood: defaults filled in, units converted, tables by their ids. */
export function provenanceOf(
  request: unknown,
  crystalId: string | undefined,
  version: string,
): z.output<typeof Provenance> {
  return {
    service: { name: 'gramyear', version },
    constants: { codata: CODATA_YEAR },
    ...(crystalId === undefined ? {} : { crystal: { id: crystalId } }),
    request: {
      sha256: createHash('sha256')
        .update(canonicalize(request) ?? '')
        .digest('hex'),
    },
  };
}
