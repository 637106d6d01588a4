/** What two nights were computed from, where it differs: the part of the input that may have moved a curve, in plain words. */
import canonicalize from 'canonicalize';
import { createPatch } from 'rfc6902';
import type { PatchOperation } from '../reports/comparison-markdown.ts';
import type { NightlyReach } from './reach-answer.ts';

/** In the order in which they are told. */
const INPUTS = [
  'table',
  'screening',
  'halo',
  'detector',
  'mediator',
  'mass splitting',
  'goal',
  'exposure',
  'masses',
  'service version',
  'constants',
  'other',
] as const;
export type Input = (typeof INPUTS)[number];

export interface InputChange {
  readonly input: Input;
  readonly words: string;
}

/** One night's curve: what the plan asked and what was answered. */
export interface NightCurve {
  readonly asked: unknown;
  readonly answer: NightlyReach;
}

/** A value that differs; `undefined` where one side does not have it. */
interface Difference {
  /** From the canonical request, or the provenance. */
  readonly path: readonly string[];
  readonly before: unknown;
  readonly after: unknown;
}

export function changedInputs(before: NightCurve, after: NightCurve): InputChange[] {
  const found = new Map<Input, string[]>();
  for (const difference of differencesOf(before.answer, after.answer)) {
    const input = inputOf(difference, before, after);
    found.set(input, [...(found.get(input) ?? []), inWords(difference, after)]);
  }
  return INPUTS.filter((input) => found.has(input)).map((input) => ({ input, words: several(found.get(input)!) }));
}

/** RFC 6902, from the request of one night to that of the other, as the service understood them. */
export function requestPatch(before: NightlyReach, after: NightlyReach): PatchOperation[] {
  return createPatch(before.request, after.request);
}

/** Whether the plan itself asks for something else. */
export function isPlanChanged(before: NightCurve, after: NightCurve): boolean {
  return canonicalize(before.asked) !== canonicalize(after.asked);
}

/** The hash of the request is left out: it says nothing that the request does not. */
function differencesOf(before: NightlyReach, after: NightlyReach): Difference[] {
  const [one, other] = [before.provenance, after.provenance];
  return [
    ...differences([], before.request, after.request).sort((a, b) => Number(isOfCrystal(b)) - Number(isOfCrystal(a))),
    ...differences(['service version'], one.service.version, other.service.version),
    ...differences(['CODATA'], one.constants.codata, other.constants.codata),
  ];
}

/** Told first: what else a table brings along is explained by it. */
function isOfCrystal({ path }: Difference): boolean {
  return path[1] === 'crystals';
}

/** Down to single values; lists of one length item by item, masses as a whole. */
function differences(path: readonly string[], before: unknown, after: unknown): Difference[] {
  if (canonicalize(before) === canonicalize(after)) return [];
  const isTree = isObject(before) && isObject(after) && Array.isArray(before) === Array.isArray(after);
  const isResized = Array.isArray(before) && Array.isArray(after) && before.length !== after.length;
  if (!isTree || isResized || path[0] === 'massesMev') return [{ path, before, after }];
  const keys = new Set([...Object.keys(before), ...Object.keys(after)]);
  return [...keys].flatMap((key) => differences([...path, key], before[key], after[key]));
}

function isObject(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null;
}

/** Where the canonical request keeps its inputs, the longest matching beginning first. */
const PLACES: readonly (readonly [RegExp, Input])[] = [
  [/^scenario\/crystals\/\d+\/(?:screened|twin)$/, 'screening'],
  [/^scenario\/crystals\b/, 'table'],
  [/^scenario\/screening\b/, 'screening'],
  [/^scenario\/halo\b/, 'halo'],
  [/^scenario\/(?:ionization|readout|backgrounds)\b/, 'detector'],
  [/^scenario\/darkMatter\/massSplittingEv$/, 'mass splitting'],
  [/^scenario\/darkMatter\b/, 'mediator'],
  [/^scenario\/goal\b/, 'goal'],
  [/^exposureKgYr$/, 'exposure'],
  [/^massesMev$/, 'masses'],
  [/^service version$/, 'service version'],
  [/^CODATA$/, 'constants'],
];

function inputOf({ path }: Difference, before: NightCurve, after: NightCurve): Input {
  const [, section, field] = path;
  if (section === 'ionization' && isOfTable(field, before, after)) return 'table';
  return PLACES.find(([place]) => place.test(path.join('/')))?.[1] ?? 'other';
}

/** A gap or pair energy that no plan gives comes from the table: another table, not another detector. */
function isOfTable(field: string | undefined, before: NightCurve, after: NightCurve): boolean {
  const given = { bandGapEv: 'bandGap', energyPerPairEv: 'energyPerPair' }[field ?? ''];
  if (given === undefined) return false;
  return [before, after].every(({ asked }) => valueAt(asked, ['scenario', 'ionization', given]) === undefined);
}

function valueAt(value: unknown, path: readonly string[]): unknown {
  return path.reduce<unknown>((at, key) => (isObject(at) ? at[key] : undefined), value);
}

function inWords({ path, before, after }: Difference, { asked }: NightCurve): string {
  if (path[0] === 'massesMev') return `${massesInWords(before)} → ${massesInWords(after)}`;
  return `${nameOf(path, asked)} ${short(before)} → ${short(after)}`;
}

/** The part of the path that the input's own name does not say; a table by the name the plan has for it. */
function nameOf(path: readonly string[], asked: unknown): string {
  const [, section, ...rest] = path;
  if (section === 'crystals' && rest.length > 0) {
    const [i, field] = rest;
    const crystal = valueAt(asked, ['scenario', 'crystal']);
    const id = valueAt(Array.isArray(crystal) ? crystal[Number(i)] : crystal, ['id']);
    return `${typeof id === 'string' ? short(id) : 'inline'} ${field ?? ''}`.trim();
  }
  const isNamed = ['halo', 'darkMatter', 'goal'].includes(section) && rest.length > 0;
  return (isNamed ? rest : path.filter((key) => key !== 'scenario')).join('.');
}

function massesInWords(masses: unknown): string {
  if (!Array.isArray(masses) || masses.length === 0) return short(masses);
  return `${masses.length} from ${masses[0]} to ${masses[masses.length - 1]} MeV`;
}

const LONGEST_VALUE = 64; // a table's id fits

function short(value: unknown): string {
  if (value === undefined) return 'none';
  const text = typeof value === 'string' ? value : JSON.stringify(value);
  return text.length > LONGEST_VALUE ? `${text.slice(0, LONGEST_VALUE)}…` : text;
}

const MOST_TOLD = 6;

function several(words: readonly string[]): string {
  const more = words.length - MOST_TOLD;
  return [...words.slice(0, MOST_TOLD), ...(more > 0 ? [`${more} more`] : [])].join('; ');
}
