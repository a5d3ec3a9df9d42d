import type { Hours } from './hours.ts';
import type { Severity } from './site.ts';

/** Who gets which mails, when, and by which server. */

export interface MailSettings {
  readonly from: string;
  readonly server: MailServer;
  readonly secondServer: MailServer | null;
  readonly gatherMs: number;
  readonly gatherDangerMs: number;
  readonly catchUpAfterMs: number;
  /** Alerts and troubles wait while it is night; left out: they do not. */
  readonly holdDuring?: Hours | null;
  /** Left out: as usual, an hour for danger and none for the rest. */
  readonly reminders?: ReminderSettings;
  readonly to: readonly Recipient[];
}

export interface ReminderSettings {
  /** Before the first reminder; null: none; left out: as usual. */
  readonly afterMs?: number | null;
  /** Who joins when reminders have not helped. */
  readonly thenTo: readonly string[];
  readonly thenAfter: { readonly reminders: number } | { readonly ms: number };
}

export interface MailServer {
  readonly host: string;
  readonly port: number;
  readonly security: 'starttls' | 'tls' | 'none';
  readonly user: string | null;
  /** Absolute path; read at each attempt, refused when others can read it. */
  readonly passwordFile: string | null;
}

/** null in a field: no restriction. */
export interface Recipient {
  readonly address: string;
  readonly machines: readonly string[] | null;
  readonly areas: readonly string[] | null;
  readonly severities: readonly Severity[] | null;
  readonly hours?: Hours | null;
}
