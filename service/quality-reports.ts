/**
 * Quality reports, worked out in a worker thread and kept: a table never changes, so its report does not either. A unit in which
 * momenta were sent is part of what is asked, because it decides which other units are looked at.
 */
import type { Compute } from './compute/compute.ts';
import type { CrystalRecord } from './crystals/crystal-record.ts';
import type { Quality } from './schemas/quality.ts';

/** Some tens of kilobytes each: the share of the f-sum rule at every momentum. */
const MOST_REPORTS = 256;
const reports = new Map<string, Quality>(); // least recently used first

export async function qualityOf(
  { id, header, values }: CrystalRecord,
  compute: Compute,
  signal: AbortSignal,
  momentumUnit?: string,
): Promise<Quality> {
  const key = momentumUnit === undefined ? id : `${id} ${momentumUnit}`;
  const quality = reports.get(key) ?? (await compute.run('quality', { header, values, momentumUnit }, { signal }));
  reports.delete(key);
  reports.set(key, quality);
  if (reports.size > MOST_REPORTS) reports.delete(reports.keys().next().value!);
  return quality;
}
