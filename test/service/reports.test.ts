import Papa from 'papaparse';
import { describe, expect, it } from 'vitest';
import { compareReach } from '../../physics/reach/comparison.ts';
import type { CurvePoint } from '../../physics/reach/mass-grid.ts';
import { comparisonCsv } from '../../service/reports/comparison-csv.ts';
import { type ComparisonReport, comparisonMarkdown } from '../../service/reports/comparison-markdown.ts';
import { csvRow } from '../../service/reports/csv-row.ts';
import { reachCsv, reachCsvHeader, reachCsvRow } from '../../service/reports/reach-csv.ts';

function curve(...points: [number, number | null][]): CurvePoint[] {
  return points.map(([massMev, crossSectionCm2]) => ({ massMev, crossSectionCm2 }));
}

/** As another program reads it. */
function parsed(csv: string): string[][] {
  const { data, errors } = Papa.parse<string[]>(csv, { skipEmptyLines: true });
  expect(errors).toEqual([]);
  return data;
}

const BASELINE = curve([0.5, 1e-36], [1, null], [2, 2e-38], [8, 1e-38], [16, 1e-38]);
const CANDIDATE = curve([1, 5e-37], [2, 1e-38], [4, 3e-38], [8, 3e-38], [16, null], [32, 1e-38]);

describe('csvRow', () => {
  // What spreadsheets take for a formula begins with = + - @, a tab or a carriage return (OWASP, "CSV Injection").
  it.each([
    { cell: '=1+2', written: "'=1+2" },
    { cell: '+cmd', written: "'+cmd" },
    { cell: '-2+3', written: "'-2+3" },
    { cell: '@SUM(A1)', written: "'@SUM(A1)" },
    { cell: '=HYPERLINK("http://invalid.invalid","x")', written: `"'=HYPERLINK(""http://invalid.invalid"",""x"")"` },
    { cell: ' =1', written: `' =1` },
    { cell: '\t=1', written: `'\t=1` },
    { cell: '\r=1', written: `"'\r=1"` },
    { cell: 'a,b', written: '"a,b"' },
    { cell: 'say "x"', written: '"say ""x"""' },
    { cell: 'two\nlines', written: '"two\nlines"' },
    { cell: 'silicon', written: 'silicon' },
    { cell: -1e-38, written: '-1e-38' },
    { cell: 0, written: '0' },
    { cell: null, written: '' },
    { cell: undefined, written: '' },
  ])('writes $cell as $written', ({ cell, written }) => {
    expect(csvRow([cell])).toBe(`${written}\r\n`);
  });
});

describe('reachCsv', () => {
  it('has units in its header and empty cells where there is no reach', () => {
    const rows = [
      { massMev: 1, crossSectionCm2: null, relativeError: 0, expectedSignal: null, expectedBackground: 3 },
      { massMev: 10, crossSectionCm2: 1.25e-38, relativeError: 1e-9, expectedSignal: 4.5, expectedBackground: 3 },
    ];
    expect(parsed(reachCsv(rows))).toEqual([
      [
        'mass (MeV)',
        'cross section (cm^2)',
        'relative error',
        'expected signal (events)',
        'expected background (events)',
      ],
      ['1', '', '', '', '3'],
      ['10', '1.25e-38', '1e-9', '4.5', '3'],
    ]);
    expect(reachCsvHeader() + rows.map(reachCsvRow).join('')).toBe(reachCsv(rows));
  });

  it('keeps every digit', () => {
    const point = { massMev: 0.1 + 0.2, crossSectionCm2: 1.2345678901234567e-38 };
    const [, row] = parsed(reachCsv([point]));
    expect(row.slice(0, 2).map(Number)).toEqual([point.massMev, point.crossSectionCm2]);
  });
});

describe('comparisonCsv', () => {
  it('has a row for each mass of either side, and says what is not a plain comparison', () => {
    const [header, ...rows] = parsed(comparisonCsv(compareReach(BASELINE, CANDIDATE, 0.05)));
    expect(header).toEqual([
      'mass (MeV)',
      'baseline cross section (cm^2)',
      'candidate cross section (cm^2)',
      'ratio candidate/baseline',
      'remark',
    ]);
    expect(rows.map(([mass, , , , remark]) => [mass, remark])).toEqual([
      ['0.5', 'outside the masses of the candidate'],
      ['1', 'the baseline does not reach this mass'],
      ['2', ''],
      ['4', 'baseline interpolated'],
      ['8', ''],
      ['16', 'the candidate does not reach this mass'],
      ['32', 'outside the masses of the baseline'],
    ]);
    expect(rows[2]).toEqual(['2', '2e-38', '1e-38', '0.5', '']);
    expect(rows[0].slice(1, 4)).toEqual(['1e-36', '', '']);
    expect(rows[6].slice(1, 4)).toEqual(['', '1e-38', '']);
  });

  it('says where a curve ends between its masses', () => {
    const csv = comparisonCsv(
      compareReach(curve([1, null], [4, 1e-38]), curve([1, null], [2, 1e-38], [4, 1e-38]), 0.05),
    );
    expect(parsed(csv)[2]).toEqual(['2', '', '1e-38', '', 'the baseline ends between its masses here']);
  });
});

describe('comparisonMarkdown', () => {
  function report(change: Partial<ComparisonReport> = {}): ComparisonReport {
    return {
      title: 'Silicon',
      baselineName: 'yesterday',
      candidateName: 'today',
      tolerance: 0.05,
      comparison: compareReach(BASELINE, CANDIDATE, 0.05),
      differences: [{ op: 'replace', path: '/halo/circularSpeed/value', value: 233 }],
      ...change,
    };
  }

  it('gives the verdict, the largest changes and where, and the numbers', () => {
    const text = comparisonMarkdown(report());
    for (const line of [
      '# Silicon',
      '**mixed**: The candidate (today) differs, with gains and losses, from the baseline (yesterday), at a tolerance of 5 %.',
      '- Largest gain: ratio 0.5 at 2 MeV',
      '- Largest loss: ratio 3 at 8 MeV',
      'Compared from 1 to 16 MeV at 5 masses; at 1 of them one curve is interpolated (log–log), because its grid does not have them.',
      '| replace | `/halo/circularSpeed/value` | `233` |',
      '| mass (MeV) | baseline (cm²) | candidate (cm²) | ratio candidate/baseline | interpolated |',
      '| 2 | 2e-38 | 1e-38 | 0.5 |  |',
      '| 1 | – | 5e-37 | – |  |',
      '## Only the baseline',
      '| 0.5 | 1e-36 | outside the masses of the other side |',
      '| 16 | 1e-38 | the other side does not reach this mass |',
    ]) {
      expect(text.split('\n')).toContain(line);
    }
  });

  it.each([
    { verdict: 'same', candidate: BASELINE, words: 'reaches as far as' },
    {
      verdict: 'better',
      candidate: BASELINE.map((p) => ({ ...p, crossSectionCm2: p.crossSectionCm2 && p.crossSectionCm2 / 2 })),
      words: 'reaches further than',
    },
    {
      verdict: 'worse',
      candidate: BASELINE.map((p) => ({ ...p, crossSectionCm2: p.crossSectionCm2 && p.crossSectionCm2 * 2 })),
      words: 'reaches less far than',
    },
  ])('says "$words" for $verdict', ({ verdict, candidate, words }) => {
    const text = comparisonMarkdown(report({ comparison: compareReach(BASELINE, candidate, 0.05), differences: [] }));
    expect(text).toContain(`**${verdict}**: The candidate (today) ${words} the baseline (yesterday)`);
    expect(text).toContain('The two scenarios are the same.');
  });

  it('says when there is nothing to compare', () => {
    const text = comparisonMarkdown(report({ comparison: compareReach(curve([1, 1e-38]), curve([2, 1e-38]), 0.05) }));
    expect(text).toContain('**mixed**: no mass at which both curves are known.');
    expect(text).toContain('The masses of the two curves do not overlap.');
  });

  it('keeps names and values of others from being markup', () => {
    const hostile = '<img src=x>|`*_[a](http://invalid.invalid)\n# x';
    const text = comparisonMarkdown(
      report({ title: hostile, baselineName: hostile, differences: [{ op: 'add', path: '/a|b', value: hostile }] }),
    );
    const [title, ...rest] = text.split('\n');
    expect(title).toBe('# &lt;img src=x&gt;\\|\\`\\*\\_\\[a\\]\\(http://invalid.invalid\\) \\# x');
    expect(rest.filter((line) => line.startsWith('# '))).toEqual([]);
    const row = rest.find((line) => line.startsWith('| add'))!;
    // Three cells: bars inside are escaped, and the value's own backtick needs a fence of two.
    expect(row.split(/(?<!\\)\|/)).toHaveLength(5);
    expect(row).toContain('`/a\\|b`');
    expect(row).toMatch(/``".*`.*"`` \|$/);
  });
});
