import { describe, expect, it } from 'vitest';
import { partChecks, partTexts } from '../../src/cli/check/part-check.ts';
import { exampleWith, siteOf } from '../config/site-parts.ts';

const textsOf = (text: string) => {
  const machine = siteOf(text).machines.find(({ id }) => id === 'blower-2');
  return machine === undefined ? [] : partChecks(machine).flatMap(partTexts);
};

describe('what check says of parts', () => {
  it('their frequencies at the nominal speed, and that the lines tell a bearing from the shaft', () => {
    // 49.5 Hz x 0.39688, 2.3213, 3.57191, 5.42809, by hand; 11 blades.
    expect(textsOf(exampleWith())).toEqual([
      'de-bearing (drive-end bearing): FTF 19.65 Hz, BSF 114.9 Hz, BPFO 176.8 Hz, BPFI 268.7 Hz',
      "de-bearing at de-h: envelope lines 1.563 Hz apart tell it from the shaft's harmonics",
      'impeller: blade pass 544.5 Hz',
      'impeller at de-h: lines 1.563 Hz apart can judge it',
    ]);
  });

  it('which frequency they cannot tell, and the spacing that would', () => {
    const sizes = [
      '        rolling_elements: 9',
      '        element_diameter: 7.94 mm',
      '        pitch_diameter: 38.5 mm',
      '        contact_angle: 0 deg',
    ].join('\n');
    // 3.04 x 49.5 Hz is 1.98 Hz from 3x: 0.99 Hz apart are two lines.
    expect(textsOf(exampleWith([sizes, '        bpfo: 3.04x']))[1]).toBe(
      'de-bearing at de-h: envelope lines 1.563 Hz apart cannot tell BPFO from 3x (0.99 Hz would)',
    );
    expect(textsOf(exampleWith([sizes, '        bpfo: 3x']))[1]).toBe(
      'de-bearing at de-h: envelope lines 1.563 Hz apart cannot tell BPFO from 3x (no line spacing would)',
    );
  });

  it('which of the other parts take finer lines than the point has', () => {
    const motor = [
      '      - id: motor',
      '        kind: electric-motor',
      '        line_frequency: 50 Hz',
      '        poles: 2',
      '      - id: gearbox',
      '        kind: gear-pair',
      '        teeth: 23',
      '        mating_teeth: 67',
      '      - id: impeller',
    ].join('\n');
    const texts = textsOf(exampleWith(['      - id: impeller', motor]));
    // Pole pass 100 - 2 x 49.5 Hz, less 0.2 Hz for the grid; mating shaft 17 Hz and hunting tooth 0.739 Hz, of which four lines are wanted.
    expect(texts.filter((text) => / at /.test(text)).slice(1, 3)).toEqual([
      'motor at de-h: lines 1.563 Hz apart cannot judge sidebands at the pole pass (0.2 Hz would)',
      'gearbox at de-h: lines 1.563 Hz apart cannot judge sidebands at hunting tooth (0.18 Hz would)',
    ]);
  });

  it('multiples only where the machine has no nominal speed', () => {
    const text = exampleWith([
      '    running_speed: 2970 rpm\n    running: speed above 300 rpm\n    after_start: 10 min\n    criticality: B',
      '    criticality: B',
    ]);
    expect(textsOf(text)[0]).toBe(
      'de-bearing (drive-end bearing): FTF 0.3969x, BSF 2.321x, BPFO 3.572x, BPFI 5.428x',
    );
  });
});
