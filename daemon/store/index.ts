/** The door of the store: what the rest of the daemon may call. */
export { type Opened, type OpenOptions, openStore } from './openStore.ts';
export { LEFT_OPEN } from './reports.ts';
export { type Restored, restore } from './restore.ts';
export {
  type ClaimedMail,
  type CommitOutcome,
  type EventChangeLine,
  type EventFilter,
  type EventUpsert,
  emptyBatch,
  type IntakeBatch,
  type KnownFile,
  type MailOutcome,
  type NewArrival,
  type NewFile,
  type NewMessage,
  type OpenFailure,
  type OpenFailureKind,
  type OutboxCounts,
  type OutboxFilter,
  type PulsarReportRow,
  type QuarantinedLine,
  type RetimedArrival,
  type Sighting,
  type StatusChange,
  type VerdictInput,
  type VerdictOutcome,
} from './shapes.ts';
export type { Store } from './store.ts';
export { type StorageTrouble, storageTrouble } from './trouble.ts';
