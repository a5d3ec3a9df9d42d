import { parseHours } from './hours.ts';
import { printDuration, printFrequency } from './print-value.ts';
import {
  type Parsed,
  parseDuration,
  parseFrequency,
  parsePercent,
  refused,
  shorten,
  understood,
} from './quantity.ts';
import { choice, list, ruled, type Shape, scalar, words } from './shape.ts';
import { key, map } from './shape-map.ts';
import type { Severity } from './site.ts';

const numberPattern = '^[+-]?[0-9.]+\\s*';

/** An id as written, never as a number: letters, digits, '-', '_', '.', so that it fits file names and commands. */
export function id(example: string): Shape<string> {
  return scalar(
    (text) => {
      const written = text.trim();
      if (/^[\p{L}\p{N}][\p{L}\p{N}._-]{0,59}$/u.test(written)) return understood(written);
      const plain = written
        .replace(/[^\p{L}\p{N}._-]+/gu, '-')
        .replace(/^[^\p{L}\p{N}]+|-+$/gu, '')
        .slice(0, 60);
      const what = `'${shorten(text)}' is no id (letters, digits, '-', '_', '.', at most 60)`;
      return refused(what, plain === '' ? null : plain);
    },
    { example, free: true },
  );
}

export const formerIds = list(id('old-id'), 20);

export function duration(leastMs: number, mostMs: number, example: string): Shape<number> {
  return scalar(durationParser(leastMs, mostMs, example), { example, pattern: durationPattern });
}

const durationPattern = `${numberPattern}(ms|s|min|h|d|days?)$`;

function durationParser(leastMs: number, mostMs: number, example: string): (text: string) => Parsed<number> {
  const unit = example.split(' ')[1];
  return ruled(
    (text: string) => parseDuration(text, unit),
    (ms) =>
      ms >= leastMs && ms <= mostMs
        ? null
        : { what: `is not from ${printDuration(leastMs)} to ${printDuration(mostMs)}`, instead: null },
  );
}

/** A duration, or 'never' (null). */
export function durationOrNever(leastMs: number, mostMs: number, example: string): Shape<number | null> {
  const parse = durationParser(leastMs, mostMs, example);
  return scalar<number | null>((text) => (text.trim() === 'never' ? understood(null) : parse(text)), {
    example,
    pattern: `^never$|${durationPattern}`,
  });
}

export function frequency(leastHz: number, mostHz: number, example: string): Shape<number> {
  const unit = example.split(' ')[1];
  const parse = ruled(
    (text: string) => parseFrequency(text, unit),
    (hz) =>
      hz >= leastHz && hz <= mostHz
        ? null
        : { what: `is not from ${printFrequency(leastHz)} to ${printFrequency(mostHz)}`, instead: null },
  );
  return scalar(parse, { example, pattern: `${numberPattern}(Hz|kHz|rpm|r/min|1/min)$` });
}

export function percent(least: number, most: number, example: string): Shape<number> {
  const parse = ruled(parsePercent, (value) =>
    value >= least && value <= most ? null : { what: `is not from ${least} to ${most} %`, instead: null },
  );
  return scalar(parse, { example, pattern: `${numberPattern}%$` });
}

function parseChannel(text: string): Parsed<number | string> {
  const written = text.trim();
  if (/^0+$/.test(written)) return refused('channels count from 1', '1');
  if (/^0\d+$/.test(written))
    return refused(`'${shorten(text)}' is a number with a 0 before it`, written.replace(/^0+/, ''));
  if (/^\d+$/.test(written)) {
    return Number(written) <= 4096
      ? understood(Number(written))
      : refused(`'${shorten(text)}' is above 4096 channels`);
  }
  return understood(written);
}

/** A channel of a file: a number from 1, or the name of a column. */
export const channel = scalar(parseChannel, { example: '1', free: true });

/** Of the mail standards only what a typing error breaks: one @, no spaces, no brackets. */
function parseAddress(text: string): Parsed<string> {
  const written = text.trim();
  if (/^[^\s@<>,;:"()[\]\\]+@[^\s@<>,;:"()[\]\\]+$/.test(written) && written.length <= 254)
    return understood(written);
  const inside = /<([^<>\s]+@[^<>\s]+)>/.exec(written)?.[1] ?? null;
  return refused(`'${shorten(text)}' is no mail address`, inside);
}

const address = scalar(parseAddress, { example: 'maintenance@larkfen.example', free: true });

/** The sender may have a name before its address: `Humledger <humledger@larkfen.example>`. */
export const senderAddress = scalar<string>(
  (text) => {
    const bare = /^[^<>@,;"\\]*<([^<>]+)>$/.exec(text.trim())?.[1] ?? text.trim();
    const parsed = parseAddress(bare);
    return parsed.ok ? understood(text.trim()) : refused(`'${shorten(text)}' is no mail address`);
  },
  { example: 'humledger@larkfen.example', free: true },
);

/** Addresses, each told one after the other. */
export const addresses = list(address, 10);

const severities = ['trouble', 'alert', 'danger'] as const satisfies readonly Severity[];

export const recipientKeys = {
  address: key(address, 'One mail address.', { required: true }),
  machines: key(list(id('blower-1'), 2000), 'Only what concerns these machines.'),
  areas: key(list(words(80, 'aeration'), 200), 'Only what concerns machines of these areas.'),
  severities: key(list(choice(severities), 3), 'Only these: trouble, alert, danger.'),
  hours: key(
    scalar(parseHours, { example: 'mon..fri 06:00..18:00', free: true, most: 40 }),
    "Only in these hours, in the site's time zone. Where nobody's hours fit, alert and trouble wait; danger goes to all.",
    { fallback: 'at any hour' },
  ),
};

export const recipients = list(map(recipientKeys), 200);
