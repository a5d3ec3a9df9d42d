/**
 * Words by which people call measuring places and directions in file names and column headings; abbreviations of the
 * trade. A guess for a first site file, nothing more.
 */
const places: ReadonlyMap<string, string> = new Map([
  ['de', 'drive end'],
  ['nde', 'non-drive end'],
  ['ib', 'inboard'],
  ['ob', 'outboard'],
  ['inboard', 'inboard'],
  ['outboard', 'outboard'],
  ['drive', 'drive'],
  ['nondrive', 'non-drive'],
  ['end', 'end'],
  ['bearing', 'bearing'],
  ['brg', 'bearing'],
  ['gearbox', 'gearbox'],
  ['motor', 'motor'],
  ['shaft', 'shaft'],
  ['point', 'point'],
  ['pos', 'position'],
  ['position', 'position'],
  ['sensor', 'sensor'],
  ['channel', 'channel'],
  ['chan', 'channel'],
  ['ch', 'channel'],
  ['acc', 'accelerometer'],
  ['vel', 'velocity'],
  ['x', 'x'],
  ['y', 'y'],
  ['z', 'z'],
]);

const directions: ReadonlyMap<string, string> = new Map([
  ['h', 'horizontal'],
  ['hor', 'horizontal'],
  ['horiz', 'horizontal'],
  ['horizontal', 'horizontal'],
  ['v', 'vertical'],
  ['ver', 'vertical'],
  ['vert', 'vertical'],
  ['vertical', 'vertical'],
  ['a', 'axial'],
  ['ax', 'axial'],
  ['axial', 'axial'],
  ['rad', 'radial'],
  ['radial', 'radial'],
]);

/** Words that say no more than that the file is a recording. */
const fillers = new Set(
  'rec record recording recordings data wave wav log file raw signal sig vib vibration sample samples measurement meas'.split(
    ' ',
  ),
);

/** 'de-h1' -> ['de', 'h', '1'] */
function wordsOf(text: string): string[] {
  return (text.toLowerCase().match(/\p{L}+|[0-9]+/gu) ?? []).map((word) => word);
}

/** Whether a word of a name reads as a measuring place: `de-v`, `brg2`, `ch1`. A mere number does not. */
export function isPlaceWord(text: string): boolean {
  const words = wordsOf(text);
  return (
    words.some((word) => !/^[0-9]/.test(word)) &&
    words.every((word) => /^[0-9]{1,2}$/.test(word) || places.has(word) || directions.has(word))
  );
}

export function isFiller(text: string): boolean {
  const words = wordsOf(text).filter((word) => !/^[0-9]/.test(word));
  return words.length === 0 || words.every((word) => fillers.has(word));
}

/** The direction that a point's id or heading ends with, or null. */
export function directionOf(text: string): string | null {
  const words = wordsOf(text).filter((word) => !/^[0-9]/.test(word));
  return directions.get(words.at(-1) ?? '') ?? null;
}

/** 'de-h' -> 'drive end, horizontal'; null where a word of it is not known, or nothing would be gained. */
export function placeName(text: string): string | null {
  const words = wordsOf(text);
  // 'channel 1' says no more than ch1 does.
  if (!isPlaceWord(text) || /^ch(an|annel)?$/.test(words[0] ?? '')) return null;
  const direction = directionOf(text);
  const named = words.map((word) => places.get(word) ?? directions.get(word) ?? word);
  const before = direction === null ? named : named.slice(0, -1);
  const name = [before.join(' '), ...(direction === null ? [] : [direction])]
    .filter((one) => one !== '')
    .join(', ');
  return name.toLowerCase() === text.toLowerCase() ? null : name;
}
