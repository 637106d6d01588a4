/**
 * What worker threads do, by name. Each is a plain function of cloneable data, so that tests can call it in-process too.
 */
import { type BuiltIn, type CatalogueEntry, loadBuiltIn } from '../crystals/built-in.ts';
import type { StoredHeader, TableRecord } from '../crystals/crystal-record.ts';
import { listTables, readHeader, readTable, removeTable, writeTable } from '../crystals/table-files.ts';
import { readUpload, type UploadJob } from '../crystals/upload/read-upload.ts';
import { type MeanInverseSpeedJob, meanInverseSpeedAnswer } from './mean-inverse-speed-answer.ts';
import { type ModulationJob, modulationAnswer } from './modulation-answer.ts';
import { type ParseJob, parseBody } from './parse-body.ts';
import { type QualityJob, qualityAnswer } from './quality-answer.ts';
import { type RatesExtras, type RatesJob, ratesAnswer } from './rates-answer.ts';
import { type ReachPointJob, reachPointAnswer } from './reach-point-answer.ts';
import { type RegridJob, regridAnswer } from './regrid-answer.ts';
import { type TableComparisonJob, tableComparisonAnswer } from './table-comparison-answer.ts';
import { type TradeOffsJob, tradeOffsAnswer } from './trade-offs-answer.ts';
import { type ValuesJob, valuesText } from './values-text.ts';

interface InFolder {
  readonly folder: string;
}

export const TASKS = {
  rates: (job: RatesJob & RatesExtras) => ratesAnswer(job),
  reachPoint: (job: ReachPointJob) => reachPointAnswer(job),
  tradeOffs: (job: TradeOffsJob) => tradeOffsAnswer(job),
  tableComparison: (job: TableComparisonJob) => tableComparisonAnswer(job),
  modulation: (job: ModulationJob) => modulationAnswer(job),
  meanInverseSpeed: (job: MeanInverseSpeedJob) => meanInverseSpeedAnswer(job),
  parseBody: (job: ParseJob) => parseBody(job),
  readUpload: (job: UploadJob) => readUpload(job),
  quality: (job: QualityJob) => qualityAnswer(job),
  regrid: (job: RegridJob) => regridAnswer(job),
  valuesText: (job: ValuesJob) => valuesText(job),
  loadBuiltIn: (job: InFolder & { readonly entry: CatalogueEntry }): BuiltIn => loadBuiltIn(job.folder, job.entry),
  readTable: (job: InFolder & { readonly id: string }): TableRecord<StoredHeader> | undefined =>
    readTable(job.folder, job.id),
  writeTable: (job: InFolder & { readonly record: TableRecord<StoredHeader> }) => writeTable(job.folder, job.record),
  listTables: (job: InFolder) => listTables(job.folder),
  readHeaders: (job: InFolder & { readonly ids: readonly string[] }) =>
    job.ids.flatMap((id) => {
      const header = readHeader(job.folder, id);
      return header ? [{ id, header }] : [];
    }),
  removeTable: (job: InFolder & { readonly id: string }) => removeTable(job.folder, job.id),
};

export type TaskName = keyof typeof TASKS;
export type TaskInput<N extends TaskName> = Parameters<(typeof TASKS)[N]>[0];
export type TaskOutput<N extends TaskName> = ReturnType<(typeof TASKS)[N]>;
