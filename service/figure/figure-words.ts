/** A reach figure in words, for those who do not see it. */
import { byMass, type FigureCurve, type ReachFigure } from './figure-input.ts';

export function descriptionOf({ curves, references = [], band }: ReachFigure): string {
  return [
    'Smallest cross section in cm² that reaches the goal, against dark-matter mass in MeV, on logarithmic axes.',
    ...curves.map(curveInWords),
    ...(band ? [`Band: ${band.name}.`] : []),
    ...references.map(({ name }) => `Reference: ${name}.`),
  ].join(' ');
}

function curveInWords({ name, points, lightestMassMev }: FigureCurve): string {
  const edge = lightestMassMev === undefined ? '' : ` Nothing is reached up to ${significant(lightestMassMev)} MeV.`;
  const reached = byMass(points).filter((point) => point.crossSectionCm2 !== null);
  if (reached.length === 0) return `${name}: no mass reaches the goal.${edge}`;
  const best = reached.reduce((a, b) => (b.crossSectionCm2! < a.crossSectionCm2! ? b : a));
  return (
    `${name}: reached from ${significant(reached[0].massMev)} to ${significant(reached[reached.length - 1].massMev)} MeV, ` +
    `lowest ${significant(best.crossSectionCm2!)} cm² at ${significant(best.massMev)} MeV.${edge}`
  );
}

/** Four digits, as short as they can be written. */
export function significant(value: number): string {
  return String(Number(value.toPrecision(4)));
}
