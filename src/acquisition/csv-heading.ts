/** Names and units of the columns, from the lines ahead of the first row of numbers. */
export interface Headings {
  /** As written, one a column; null where the file has no heading row. */
  readonly names: readonly string[] | null;
  readonly units: readonly (string | null)[] | null;
}

const longestName = 80;

const unitLetters = new Set('s h g m A V N K C F W % - 1'.split(' '));
const knownUnits = new Set(
  (
    'sec ms us min gn mg ug gal m/s2 m/s^2 m/s**2 m/sec2 m/sec^2 mm/s2 mm/s^2 in/s2 in/s^2 ft/s2 ft/s^2 m/s ' +
    'mm/s cm/s um/s in/s ips ft/s cm mm um nm in mil mils thou mv uv kv ma ka pa kpa mpa hpa bar mbar psi ' +
    'kn n*m knm hz khz rpm 1/min 1/s rev/min degc degf deg rad rad/s db dba kw l/s l/min ' +
    'm3/h strain ustrain counts'
  ).split(' '),
);

/** Text without its brackets if it is a unit, null otherwise; the unit is given as written. */
export function unitText(text: string): string | null {
  const bare = text.trim().replace(/^[[(]\s*|\s*[\])]$/g, '');
  const plain = bare
    .replace(/²/g, '2')
    .replace(/³/g, '3')
    .replace(/[µμ]/g, 'u')
    .replace(/°/g, '')
    .replace(/·/g, '*')
    .replace(/\s*(r\.?m\.?s\.?|rms|peak|pk|pk-pk|peak to peak)$/i, '');
  return unitLetters.has(plain) || knownUnits.has(plain.toLowerCase()) ? bare : null;
}

/** Splits a heading line as the rows are split; quoted fields may hold the delimiter. */
export function splitHeading(line: string, delimiter: string): string[] {
  const bare = line.replace(/^\s*(#|%|\/\/)+\s*/, '');
  if (delimiter === ' ') {
    const trimmed = bare.trim();
    return trimmed === '' ? [] : (trimmed.match(/"[^"]*"|\S+/g) ?? []).map(unquoted);
  }
  const fields: string[] = [];
  let field = '';
  let quoted = false;
  for (const letter of bare) {
    if (letter === '"') quoted = !quoted;
    if (letter === delimiter && !quoted) {
      fields.push(unquoted(field));
      field = '';
    } else field += letter;
  }
  fields.push(unquoted(field));
  return fields;
}

function unquoted(field: string): string {
  const trimmed = field.trim();
  const quoted = trimmed.length > 1 && trimmed.startsWith('"') && trimmed.endsWith('"');
  return quoted ? trimmed.slice(1, -1).replaceAll('""', '"').trim() : trimmed;
}

/** `above`: the lines ahead of the numbers, the nearest first, each split into its fields. */
export function headingsOf(above: readonly (readonly string[])[], columns: number): Headings {
  const nearest = above[0];
  if (nearest === undefined || nearest.length !== columns) return { names: null, units: null };
  const isUnits = nearest.some((field) => field !== '') && nearest.every((f) => f === '' || looksLikeUnit(f));
  if (!isUnits) return { names: nearest, units: null };
  const units = nearest.map((field) =>
    field === '' ? null : (unitText(field) ?? bracketed(field) ?? field),
  );
  if (above[1]?.length === columns) return { names: above[1], units };
  // A single row may be both: columns called 'A' and 'V'. Equal or bracketed ones are units only.
  const named = new Set(nearest).size === columns && nearest.every((field) => bracketed(field) === null);
  return { names: named ? nearest : null, units };
}

function looksLikeUnit(field: string): boolean {
  return unitText(field) !== null || bracketed(field) !== null;
}

function bracketed(field: string): string | null {
  return /^[[(]\s*(.*?)\s*[\])]$/.exec(field)?.[1] ?? null;
}

/** 'DE vertical [m/s2]' -> name and unit; text in brackets that is no unit belongs to the name. */
export function nameAndUnit(heading: string): { readonly name: string; readonly unit: string | null } {
  const parts = /^(.*\S)\s*([[(][^\])]*[\])])$/.exec(heading);
  const unit = parts === null ? null : unitText(parts[2]);
  return { name: plainName(parts === null || unit === null ? heading : parts[1]), unit };
}

/** One line of printable text of bounded length. */
function plainName(text: string): string {
  const printable = text.replace(
    /[\u0000-\u001f\u007f-\u009f\u2028\u2029\u200b-\u200f\u202a-\u202e\ufeff]/g,
    '',
  );
  return [...printable.trim()].slice(0, longestName).join('');
}

/** Names for people and site file: the heading, the channel's number where it is empty, a second equal one marked. */
export function distinctNames(names: readonly string[]): string[] {
  const taken = new Set<string>();
  return names.map((name, index) => {
    const wanted = name === '' ? String(index + 1) : name;
    let free = wanted;
    for (let count = 2; taken.has(free); count++) free = `${wanted} ${count}`;
    taken.add(free);
    return free;
  });
}
