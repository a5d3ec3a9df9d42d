import { parsePhysical } from '../config/quantity.ts';
import { parseSensitivity } from '../config/sensitivity.ts';
import type { SampleUnit } from '../config/site.ts';
import { unitOf } from '../config/units.ts';
import { printableName } from './file-name.ts';
import type { Sidecar, SidecarChannel, StatedStart } from './recording.ts';
import { parseIsoStart } from './start-time.ts';

/**
 * The sidecar of `pump-3.wav` is `pump-3.json` beside it:
 *
 *     { "start": "2026-11-03T09:30:00Z", "speed_rpm": 1480, "load_percent": 75, "running": true,
 *       "channels": { "1": { "samples_in": "V", "full_scale": "10 V", "sensitivity": "100 mV/g" } } }
 *
 * Every key may be missing; an unknown one is refused, since a mistyped `speed_rpm` would otherwise be silently
 * nothing. `full_scale` may be a bare number in `samples_in`.
 */
export const largestSidecarBytes = 65_536;
const deepest = 4;
const mostChannels = 256;
const fastestRpm = 1_000_000;
/** What turns once in ten weeks stands: an order of it would be no number. */
const slowestRpm = 1e-5;

export interface SidecarRefusal {
  /** What is wrong, where, and what would be right. */
  readonly reason: string;
}

/** Reads a sidecar's bytes. */
export function parseSidecar(bytes: Uint8Array): Sidecar | SidecarRefusal {
  if (bytes.length > largestSidecarBytes) {
    return { reason: `sidecar: ${bytes.length} bytes, at most ${largestSidecarBytes} are read` };
  }
  let text: string;
  let value: unknown;
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    return { reason: 'sidecar: not UTF-8; save it as UTF-8' };
  }
  if (nesting(text) > deepest) return { reason: `sidecar: nested deeper than ${deepest}` };
  try {
    value = JSON.parse(text);
  } catch (error) {
    return { reason: `sidecar: no JSON: ${printableName(error instanceof Error ? error.message : '')}` };
  }
  try {
    return sidecarOf(value);
  } catch (error) {
    if (error instanceof Wrong) return { reason: `sidecar: ${error.message}` };
    throw error;
  }
}

/** Carries the reason out of the nested readers below; never leaves this file. */
class Wrong extends Error {}

function sidecarOf(value: unknown): Sidecar {
  const fields = plainObject(value, 'the whole', [
    'start',
    'speed_rpm',
    'load_percent',
    'running',
    'channels',
  ]);
  const channels: Record<string, SidecarChannel> = Object.create(null);
  const given = plainObject(fields.channels ?? {}, 'channels', null);
  const names = Object.keys(given);
  if (names.length > mostChannels) throw new Wrong(`channels: ${names.length}, at most ${mostChannels}`);
  for (const name of names) channels[name] = channelOf(given[name], `channels.${printableName(name)}`);
  return {
    start: startOf(fields.start),
    speedRpm: speedOf(fields.speed_rpm),
    loadPercent: numberOf(fields.load_percent, 'load_percent', -1000, 1000),
    running: runningOf(fields.running),
    channels: { ...channels },
  };
}

function plainObject(
  value: unknown,
  where: string,
  known: readonly string[] | null,
): Record<string, unknown> {
  if (typeof value !== 'object' || value === null || Array.isArray(value)) {
    throw new Wrong(`${where} is no object in { }`);
  }
  for (const key of Object.keys(value)) {
    if (key === '__proto__') throw new Wrong(`${where}: no key may be named __proto__`);
    if (known !== null && !known.includes(key)) {
      throw new Wrong(`${where}: "${printableName(key)}" is not known; known are ${known.join(', ')}`);
    }
  }
  return value as Record<string, unknown>;
}

function startOf(value: unknown): StatedStart | null {
  if (value === undefined || value === null) return null;
  const start = typeof value === 'string' ? parseIsoStart(value, 'sidecar') : null;
  if (start === null) throw new Wrong('start: no date and time; write it as "2026-11-03T09:30:00Z"');
  return start;
}

function speedOf(value: unknown): number | null {
  const rpm = numberOf(value, 'speed_rpm', 0, fastestRpm);
  return rpm === null || rpm >= slowestRpm ? rpm : 0;
}

function numberOf(value: unknown, key: string, least: number, most: number): number | null {
  if (value === undefined || value === null) return null;
  if (typeof value !== 'number' || !Number.isFinite(value) || value < least || value > most) {
    throw new Wrong(`${key}: ${shown(value)} is no number from ${least} to ${most}`);
  }
  return value;
}

function runningOf(value: unknown): boolean | null {
  if (value === undefined || value === null) return null;
  if (typeof value !== 'boolean') throw new Wrong(`running: ${shown(value)} is neither true nor false`);
  return value;
}

function channelOf(value: unknown, where: string): SidecarChannel {
  const fields = plainObject(value, where, ['samples_in', 'full_scale', 'sensitivity']);
  const samplesIn =
    fields.samples_in === undefined ? undefined : unitField(fields.samples_in, `${where}.samples_in`);
  const channel: { -readonly [Key in keyof SidecarChannel]: SidecarChannel[Key] } = {};
  if (samplesIn !== undefined) channel.samplesIn = samplesIn;
  if (fields.full_scale !== undefined) {
    channel.fullScale = fullScaleOf(fields.full_scale, samplesIn, `${where}.full_scale`);
  }
  if (fields.sensitivity !== undefined) {
    channel.sensitivity = sensitivityOf(fields.sensitivity, `${where}.sensitivity`);
  }
  return channel;
}

function unitField(value: unknown, where: string): SampleUnit {
  const unit = typeof value === 'string' ? unitOf(value) : null;
  const { dimension, text, inSi } = unit ?? { dimension: null, text: '', inSi: 0 };
  switch (dimension) {
    case 'acceleration':
    case 'velocity':
    case 'displacement':
    case 'sound-pressure':
    case 'voltage':
    case 'current':
      return { text, quantity: dimension, inSi };
    default:
      throw new Wrong(`${where}: ${shown(value)} is no unit of samples, such as "V" or "m/s2"`);
  }
}

/** In the unit of the samples; a text with a unit needs `samples_in` beside it, so that both can be compared. */
function fullScaleOf(value: unknown, samplesIn: SampleUnit | undefined, where: string): number {
  if (typeof value === 'number' && Number.isFinite(value) && value > 0) return value;
  if (typeof value === 'string') {
    if (samplesIn === undefined) throw new Wrong(`${where}: give samples_in beside it`);
    const parsed = parsePhysical(value, [samplesIn.quantity], samplesIn.text);
    if (!parsed.ok) throw new Wrong(`${where}: ${printableName(parsed.what)}`);
    if (parsed.value.value > 0) return parsed.value.value / samplesIn.inSi;
  }
  throw new Wrong(`${where}: ${shown(value)} is no full scale, such as "10 V"`);
}

function sensitivityOf(value: unknown, where: string): number {
  if (typeof value !== 'string')
    throw new Wrong(`${where}: ${shown(value)} has no unit; write it as "100 mV/g"`);
  const parsed = parseSensitivity(value);
  if (!parsed.ok) throw new Wrong(`${where}: ${printableName(parsed.what)}`);
  return parsed.value.voltsPerSi;
}

function shown(value: unknown): string {
  const text = typeof value === 'number' ? String(value) : (JSON.stringify(value) ?? 'nothing');
  return printableName(text.slice(0, 60));
}

/** Deepest nesting of brackets outside strings; counted before parsing, so that nothing deep is ever built. */
function nesting(text: string): number {
  let depth = 0;
  let most = 0;
  for (const [mark] of text.matchAll(/"(?:[^"\\]|\\.)*"?|[[\]{}]/gs)) {
    if (mark === '{' || mark === '[') most = Math.max(most, ++depth);
    else if (mark === '}' || mark === ']') depth--;
  }
  return most;
}
