import { type Build, valueOr } from './layers.ts';
import type { speedKeys } from './schema-speed.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import { type SpeedSettings, usualSpeed } from './speed-settings.ts';

export type WrittenSpeed = Written<ReadMap<typeof speedKeys>>;

/** How a machine's running speed is found; what cannot work is told. */
export function buildSpeed(
  { reading }: Build,
  written: WrittenSpeed | null,
  {
    id,
    runningSpeedHz,
    sidecars,
  }: {
    readonly id: string;
    readonly runningSpeedHz: number | null;
    /** Whether its recordings may have sidecars, which may say the speed. */
    readonly sidecars: boolean;
  },
): SpeedSettings {
  if (written === null) return usualSpeed;
  const { keys, has } = written.value;
  const {
    pulse_channel: channel,
    pulses_per_turn: perTurn,
    pulse_threshold: threshold,
    find_within: within,
  } = keys;
  for (const [name, one] of [
    ['pulses_per_turn', perTurn],
    ['pulse_threshold', threshold],
  ] as const) {
    if (one === null || has.has('pulse_channel')) continue;
    const what = `${name} of ${id} has no meaning without a channel that gives pulses`;
    reading.problem(one.at, what, 'add: pulse_channel: 3', name);
  }
  if (within !== null && within.value !== null && runningSpeedHz === null && !sidecars) {
    const what = `find_within has nothing to search around: ${id} has no running_speed`;
    reading.problem(within.at, what, 'add: running_speed: 2970 rpm', 'find_within');
  }
  return {
    findWithinPercent: within === null ? usualSpeed.findWithinPercent : within.value,
    pulses:
      channel === null
        ? null
        : {
            channel: channel.value,
            pulsesPerTurn: valueOr(perTurn, 1),
            thresholdV: valueOr(threshold, null),
          },
  };
}
