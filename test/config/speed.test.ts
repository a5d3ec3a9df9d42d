import { describe, expect, it } from 'vitest';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const written = `    speed:                          # of each recording, where no sidecar says it
      pulse_channel: 4              # a sensor that sees a mark on the shaft go by
      pulses_per_turn: 1
      find_within: 5 %              # without pulses: looked for in the spectrum, so far around running_speed; or never
`;

const withSpeed = (...lines: string[]) =>
  exampleWith([written, ['    speed:', ...lines.map((line) => `      ${line}`), ''].join('\n')]);
const speedOf = (...lines: string[]) => siteOf(withSpeed(...lines)).machines[1].speed;
const told = (...lines: string[]) => complaints(withSpeed(...lines)).join('\n');

describe('the speed of a machine in the site file', () => {
  it('is looked for within 5 % of the declared one where nothing is written', () => {
    expect(siteOf(exampleWith()).machines[0].speed).toEqual({ findWithinPercent: 5, pulses: null });
  });

  it('comes from a pulse channel, by number or name', () => {
    expect(speedOf('pulse_channel: 2')).toEqual({
      findWithinPercent: 5,
      pulses: { channel: 2, pulsesPerTurn: 1, thresholdV: null },
    });
    expect(speedOf('pulse_channel: shaft mark', 'pulses_per_turn: 60', 'pulse_threshold: 2.5 V')).toEqual({
      findWithinPercent: 5,
      pulses: { channel: 'shaft mark', pulsesPerTurn: 60, thresholdV: 2.5 },
    });
    expect(speedOf('pulse_channel: 2', 'pulse_threshold: -12 V').pulses?.thresholdV).toBe(-12);
  });

  it('is never looked for in the spectrum where the site file says so', () => {
    expect(speedOf('find_within: never').findWithinPercent).toBeNull();
    expect(speedOf('find_within: 10 %').findWithinPercent).toBe(10);
  });

  it.each([
    [['find_within: 50 %'], "'50 %' is not from 0.5 % to 30 %, or never"],
    [['find_within: 5'], 'has no unit'],
    [['pulse_channel: 0'], 'channels count from 1'],
    [['pulse_channel: 2', 'pulses_per_turn: 0'], 'pulses_per_turn'],
    [['pulse_channel: 2', 'pulses_per_turn: 1.5'], 'pulses_per_turn'],
    [['pulse_channel: 2', 'pulse_threshold: 2.5'], 'has no unit'],
    [['pulse_channel: 2', 'pulse_threshold: 2.5 mm/s'], 'pulse_threshold'],
    [['pulses_per_turn: 4'], 'no meaning without a channel that gives pulses'],
    [['pulse_threshold: 2 V'], 'no meaning without a channel that gives pulses'],
    [['pulse_chanel: 2'], 'write: pulse_channel'],
  ])('is refused: %j', (lines, what) => {
    expect(told(...lines)).toContain(what);
  });

  it('is refused where nothing says around which speed to look', () => {
    const lines = written.replace(
      '      pulse_channel: 4              # a sensor that sees a mark on the shaft go by\n      pulses_per_turn: 1\n',
      '',
    );
    const from = exampleWith(
      [written, lines],
      [
        '    running_speed: 2970 rpm\n    running: speed above 300 rpm\n    after_start: 10 min\n    criticality: B\n',
        '    criticality: B\n',
      ],
    );
    expect(complaints(from).join('\n')).not.toContain('nothing to search around');
    const none = from.replace('  settle: 5 s\n', '  settle: 5 s\n  sidecar: none\n');
    expect(complaints(none).join('\n')).toContain('find_within has nothing to search around');
  });
});

describe('a pulse channel', () => {
  it('is claimed: no point of the same files may take it for vibration', () => {
    const both = exampleWith([written, written.replace('pulse_channel: 4 ', 'pulse_channel: 1 ')]);
    expect(complaints(both)).toEqual([
      expect.stringMatching(
        /the pulses of blower-2 and blower-2\/de-h \(line \d+\) claim channel 1 of the same file/,
      ),
    ]);
  });

  it('may be the same for two machines on one shaft', () => {
    const pattern: [string, string] = ['files: <machine>_<any>.wav', 'files: hall_<any>.wav'];
    const one = exampleWith(
      pattern,
      ['    like: [blower-2]', '    speed:\n      pulse_channel: 4\n    like: [blower-2]'],
      ['mounting: glue\n        channel: 1', 'mounting: glue\n        channel: 3'],
    );
    expect(complaints(one)).toEqual([]);
  });
});
