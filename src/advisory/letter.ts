import type { Severity } from '../config/site.ts';
import type { ZoneLetter } from '../config/zone-tables.ts';

/**
 * A message before it is rendered: blocks of words, the same for text and HTML, so that neither can say less than
 * the other. Strings are foreign as far as the renderers are concerned: they make them harmless.
 */
export interface Letter {
  /** What a reader and a phone's preview see first: what to do, or the morning in one sentence. */
  readonly lead: string;
  /** Below the lead: whose message this is ('Larkfen Waterworks, Tue 1 Dec 2026, 06:30'). */
  readonly head: string;
  /** Marked TEST above everything. */
  readonly test: boolean;
  readonly blocks: readonly Block[];
}

/** Words around the letter of a zone, which HTML sets on its own lightness of one hue. */
export interface ZoneSaid {
  readonly before: string;
  readonly zone: ZoneLetter;
  readonly after: string;
}

export type Said = string | ZoneSaid;

/** The same without the hue. */
export function saidText(said: Said): string {
  return typeof said === 'string' ? said : `${said.before}${said.zone}${said.after}`;
}

export type Block =
  | { readonly kind: 'heading'; readonly text: string }
  /** An alarm, a trouble or another finding; `more` are lines below it. */
  | {
      readonly kind: 'finding';
      readonly mark: Severity | null;
      readonly number: number | null;
      readonly text: string;
      readonly more: readonly string[];
    }
  | { readonly kind: 'paragraph'; readonly text: string }
  /** Names with what is said of each. */
  | { readonly kind: 'pairs'; readonly rows: readonly (readonly [name: string, said: Said])[] }
  | {
      readonly kind: 'table';
      readonly heads: readonly string[];
      readonly rows: readonly (readonly Said[])[];
    }
  | { readonly kind: 'command'; readonly text: string }
  /** Carried by the mail itself under this name. What it shows is said in words as well. */
  | {
      readonly kind: 'picture';
      readonly name: string;
      readonly alt: string;
      readonly size: { readonly widthPx: number; readonly heightPx: number };
    }
  /** Caution and other words that stand last. */
  | { readonly kind: 'closing'; readonly text: string };

export const markWord: Readonly<Record<Severity, string>> = {
  alert: 'ALERT',
  danger: 'DANGER',
  trouble: 'TROUBLE',
};
