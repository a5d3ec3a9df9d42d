import { type Parsed, refused, shorten, understood } from './quantity.ts';

/** How often something comes, as people say it: '5 a week', '1 a month'. */
export interface HowOften {
  readonly times: number;
  readonly per: Period;
}

const periodsMs = {
  day: 86_400_000,
  week: 7 * 86_400_000,
  /** A twelfth of a year of 365.25 days. */
  month: 30.4375 * 86_400_000,
  year: 365.25 * 86_400_000,
} as const;

type Period = keyof typeof periodsMs;

/** '5 a week', '1 a month', '0.5 per day'; from 0 to 10 000 times. */
export function parseHowOften(text: string): Parsed<HowOften> {
  const written = text.trim();
  const example = `'${shorten(text)}' is not how often, such as 5 a week or 1 a month`;
  const bare = /^\d+(?:\.\d+)?$/.test(written);
  if (bare) return refused(example, `${written} a week`);
  const [, number, per] = /^(\d+(?:\.\d+)?)\s*(?:an?|per|\/)\s*(day|week|month|year)$/i.exec(written) ?? [];
  const times = Number(number);
  if (per === undefined || times > 10_000) return refused(example);
  return understood({ times, per: per.toLowerCase() as Period });
}

/** How many times that makes in a time. */
export function timesWithin({ times, per }: HowOften, ms: number): number {
  return (times * ms) / periodsMs[per];
}

export function printHowOften({ times, per }: HowOften): string {
  return `${times} a ${per}`;
}
