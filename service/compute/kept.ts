/** What a worker thread keeps from one job to the next: a few of each kind, the least recently used leaves first. */
export function kept<T>(from: Map<string, T>, most: number, key: string, make: () => T): T {
  const value = from.get(key) ?? make();
  from.delete(key);
  from.set(key, value);
  if (from.size > most) from.delete(from.keys().next().value!);
  return value;
}
