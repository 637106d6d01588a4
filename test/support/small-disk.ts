/** A disk that is soon full. */
import { execFileSync } from 'node:child_process';

/** Mounts a tmpfs of `size` at an empty folder; undefined, and a line that says what is missing, where that is not allowed. */
export function smallDisk(folder: string, size: string): string | undefined {
  try {
    execFileSync('mount', ['-t', 'tmpfs', '-o', `size=${size}`, 'tmpfs', folder], { stdio: 'ignore' });
    return folder;
  } catch {
    console.log('skipped: the full disk needs the right to mount a tmpfs (root, CAP_SYS_ADMIN)');
    return undefined;
  }
}
