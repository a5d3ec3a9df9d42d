import { type Parsed, parsePercent, parsePhysical, refused, shorten, understood } from './quantity.ts';
import { channel } from './schema-values.ts';
import { plainNumber, scalar } from './shape.ts';
import { key } from './shape-map.ts';

const leastWithin = 0.5;
const mostWithin = 30;

/** '5 %', or 'never' (null). */
function parseWithin(text: string): Parsed<number | null> {
  if (text.trim() === 'never') return understood(null);
  const parsed = parsePercent(text);
  if (!parsed.ok) return parsed;
  if (parsed.value >= leastWithin && parsed.value <= mostWithin) return parsed;
  return refused(`'${shorten(text)}' is not from ${leastWithin} % to ${mostWithin} %, or never`);
}

function parseThreshold(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['voltage'], 'V');
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** How the running speed of each recording is found, where no sidecar says it. */
export const speedKeys = {
  pulse_channel: key(
    channel,
    'Channel of the files of this machine that gives pulses: a number from 1, or a column name.',
  ),
  pulses_per_turn: key(plainNumber(1, 4096, true, '1'), 'Pulses in one turn of the shaft.', {
    fallback: '1',
  }),
  pulse_threshold: key(scalar(parseThreshold, { example: '2.5 V' }), 'A pulse rises through this voltage.', {
    fallback: "halfway between the channel's two levels",
  }),
  find_within: key(
    scalar(parseWithin, { example: '5 %' }),
    'How far from running_speed, or from the speed that a sidecar says, the harmonics of the shaft are looked for in the spectrum; or never.',
    { fallback: '5 %' },
  ),
};
