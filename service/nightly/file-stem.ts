/** What the files of a curve are called: its name where that is safe on any disk, else what is left of it and a short hash. */
import { createHash } from 'node:crypto';

/** Names that a run's own files have, and that some systems keep for devices. */
const TAKEN = /^(?:summary|plan|con|prn|aux|nul|com\d|lpt\d)$/;
const LONGEST = 60;

export function fileStem(name: string): string {
  const slug = name
    .normalize('NFKD')
    .replace(/\p{M}/gu, '')
    .toLowerCase()
    .replace(/[^a-z0-9]+/g, '-')
    .slice(0, LONGEST)
    .replace(/^-|-$/g, '');
  if (slug === name && !TAKEN.test(slug)) return slug;
  const hash = createHash('sha256').update(name).digest('hex').slice(0, 8);
  return `${slug || 'curve'}-${hash}`;
}
