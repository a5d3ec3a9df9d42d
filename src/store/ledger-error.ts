/**
 * What the ledger says when it cannot be used. Kinds: `busy` somebody else held it too long; `full` no room on the
 * disk; `read-only` no right to write; `damaged` the file is not (any more) a sound ledger; `other` the disk failed.
 */
export type LedgerErrorKind = 'busy' | 'full' | 'read-only' | 'damaged' | 'other';

/** The one error that `transact` and `read` throw for what happens outside the program; all else is a broken promise. */
export class LedgerError extends Error {
  override readonly name = 'LedgerError';
  readonly kind: LedgerErrorKind;
  /** SQLite's own code, for the log. */
  readonly code: string;

  constructor(kind: LedgerErrorKind, code: string, message: string, cause: unknown) {
    super(message, { cause });
    this.kind = kind;
    this.code = code;
  }
}

/** Why a ledger is not opened, in one line for people. */
export interface LedgerRefusal {
  readonly refused:
    | 'owned'
    | 'newer'
    | 'older'
    | 'missing'
    | 'foreign'
    | 'network-share'
    | 'exists'
    | LedgerErrorKind;
  readonly reason: string;
}

export function isLedgerRefusal(answer: object): answer is LedgerRefusal {
  return 'refused' in answer;
}

export const whatToDoWithDamage =
  'stop the service, put the newest backup in its place and start: what the backup lacks is taken again from the archive';

const kindsByCode: readonly (readonly [prefix: string, kind: LedgerErrorKind, words: string])[] = [
  ['SQLITE_BUSY', 'busy', 'is locked by somebody else'],
  ['SQLITE_LOCKED', 'busy', 'is locked by somebody else'],
  ['SQLITE_FULL', 'full', 'cannot grow: the disk is full'],
  ['SQLITE_READONLY', 'read-only', 'cannot be written: the file or folder is read-only'],
  ['SQLITE_CANTOPEN', 'read-only', 'cannot be opened: the folder is missing or gives no right'],
  ['SQLITE_PERM', 'read-only', 'cannot be opened: no right'],
  ['SQLITE_AUTH', 'read-only', 'cannot be opened: no right'],
  ['SQLITE_CORRUPT', 'damaged', `is damaged; ${whatToDoWithDamage}`],
  ['SQLITE_NOTADB', 'damaged', `is not a ledger; ${whatToDoWithDamage}`],
  ['SQLITE_IOERR', 'other', 'could not be read or written: the disk reported an error'],
  ['SQLITE_NOMEM', 'other', 'could not be used: out of memory'],
  ['SQLITE_NOLFS', 'other', 'is too large for this disk'],
];

export function codeOf(error: unknown): string {
  return error instanceof Error && 'code' in error && typeof error.code === 'string' ? error.code : '';
}

export function isBusy(error: unknown): boolean {
  return /^SQLITE_(BUSY|LOCKED)/.test(codeOf(error));
}

/** SQLite's error as a LedgerError; anything that is a programming mistake comes back as it is. */
export function toLedgerError(error: unknown, path: string): unknown {
  const code = codeOf(error);
  const found = kindsByCode.find(([prefix]) => code.startsWith(prefix));
  if (found === undefined) return error;
  return new LedgerError(found[1], code, `the ledger ${path} ${found[2]} (${code})`, error);
}

/** The same as a refusal, for opening and backup; a programming mistake is thrown on. */
export function toRefusal(error: unknown, path: string): LedgerRefusal {
  const known = error instanceof LedgerError ? error : toLedgerError(error, path);
  if (!(known instanceof LedgerError)) throw error;
  return { refused: known.kind, reason: known.message };
}

/** What the ledger says when it cannot be used; it is no fault of the work at hand, which waits for the ledger. */
export function isLedgersOwn(error: unknown): boolean {
  return isBusy(error) || toLedgerError(error, '') instanceof LedgerError;
}
