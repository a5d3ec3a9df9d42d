/** The README against the program: what it shows can be typed, what it quotes is printed, every key it names is real. */
import { readFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { qualityFlags } from '../../src/acquisition/recording.ts';
import { parseSidecar } from '../../src/acquisition/sidecar.ts';
import { loadSite } from '../../src/config/load.ts';
import { livedInSite, type Ran, run, type SmallSite } from './small-site.ts';

const readme = readFileSync('README.md', 'utf8');
const scripts = (JSON.parse(readFileSync('package.json', 'utf8')) as { scripts: Record<string, string> })
  .scripts;
const words = readme.replace(/\s+/g, ' ');

interface Block {
  readonly language: string;
  readonly text: string;
}

const blocks: readonly Block[] = Array.from(
  readme.matchAll(/^```(\w+)\n([\s\S]*?)^```$/gm),
  ([, language = '', text = '']) => ({ language, text }),
);
const textsOf = (language: string) =>
  blocks.filter((block) => block.language === language).map(({ text }) => text);

/** Command lines in code blocks and in the table of commands. */
const lines = [
  ...textsOf('sh').flatMap((text) => text.split('\n')),
  ...Array.from(readme.matchAll(/`(humledger [a-z][^`]*)`/g), ([, line = '']) => line),
].flatMap((line) =>
  line
    .replace(/(^|\s)#.*$/, '')
    .split('&&')
    .map((part) => part.trim())
    .filter((part) => part !== ''),
);
const ofProgram = lines.flatMap((line) => {
  const match = /^(?:npm run -s humledger -- |humledger )(.*)$/.exec(line);
  return match === null || match[1] === '--version' ? [] : [match[1] as string];
});

/** Words as a shell parts them, single quotes only. */
function shellWords(line: string): string[] {
  return Array.from(line.matchAll(/'([^']*)'|(\S+)/g), ([, quoted, plain]) => quoted ?? plain ?? '');
}

describe('what README says before all else', () => {
  it('the job, then the caution, ahead of the first command', () => {
    const opening = readme.slice(0, readme.indexOf('```')).replace(/\s+/g, ' ');
    for (const text of [
      'Alerts do not replace inspection by qualified maintenance personnel',
      "The site sets the limits, following the machine's maker and the standards that apply",
      'Before anyone approaches a machine, lock-out and local rules apply',
      'not a machinery protection system',
      'must never replace or drive a trip',
    ])
      expect(opening).toContain(text);
    expect(opening.indexOf('drops recordings into a folder')).toBeLessThan(opening.indexOf('Caution'));
  });

  it('that no summary means no service', () => {
    expect(words).toContain('No summary by 07:00 means the service is down');
  });

  it('two commands, the first of all, that exist', () => {
    expect(lines.slice(0, 4)).toEqual(['npm ci', 'npm run demo', 'npm ci', 'npm test']);
    for (const line of lines) {
      const script = /^npm (?:run (?:-s )?)?([\w:]+)/.exec(line)?.[1];
      if (line.startsWith('npm ') && !['ci', 'pack', 'install'].includes(script ?? ''))
        expect(Object.keys(scripts)).toContain(script);
    }
  });
});

describe('commands in README', () => {
  it.each([...new Set(ofProgram)])('humledger %s', async (line) => {
    const given = shellWords(line);
    const [command = '', ...rest] = given;
    const sub =
      command === 'alarms' && /^[a-z]/.test(rest[0] ?? '') ? [command, rest.shift() as string] : [command];
    const { status, out } = await run([...sub, '--help']);
    expect(status).toBe(0);
    expect(out).toContain(`Usage: humledger ${sub.join(' ')}`);
    let places = out.match(/Usage: .*/)?.[0].match(/<[^>]*>/g)?.length ?? 0;
    if (/Usage: .*\.\.\.>/.test(out)) places = Number.POSITIVE_INFINITY;
    while (rest.length > 0) {
      const word = rest.shift() as string;
      if (!word.startsWith('--')) {
        expect(places--, `${word} is one argument too many`).toBeGreaterThan(0);
        continue;
      }
      const option = new RegExp(`^ +${word}( <[^>]*>)?(?= |$)`, 'm').exec(out);
      expect(option, `${word} of ${sub.join(' ')}`).not.toBeNull();
      if (option?.[1] !== undefined) expect(rest.shift(), `value of ${word}`).toMatch(/^[^-]/);
    }
  });

  it('are all that there are, and no others', async () => {
    const { out } = await run(['--help']);
    const known = Array.from(out.matchAll(/^ {2}([a-z-]+) (?:\[|<)/gm), ([, name = '']) => name);
    const shown = new Set(
      Array.from(readme.matchAll(/^\| `([a-z-]+)[^`]*` \|.*`humledger /gm), ([, name]) => name),
    );
    expect([...shown].sort()).toEqual(known.filter((name) => name !== 'help').sort());
  });

  it('print what is quoted of analyse', async () => {
    const at = blocks.findIndex(({ text }) => text.startsWith('humledger analyse demo-data/'));
    const args = shellWords((blocks[at] as Block).text.trim()).slice(1);
    const { status, out } = await run(args, { workingFolder: process.cwd() });
    expect(status).toBe(0);
    expect(out.trimEnd()).toBe((blocks[at + 1] as Block).text.trimEnd());
  });
});

describe('site files in README', () => {
  const base = {
    site: 'Larkfen Waterworks',
    time_zone: 'Europe/Dublin',
    folders: { drop: './drop', data: './data' },
    recordings: { files: '<machine>_<any>.wav', samples_in: 'm/s2' },
    machine_types: {
      usual: { bands: [{ id: 'overall', quantity: 'velocity', from: '10 Hz', to: '1000 Hz' }] },
    },
    machines: [{ id: 'P-101', type: 'usual', points: [{ id: 'DE', quantity: 'acceleration' }] }],
  };

  it.each(textsOf('yaml').map((text) => [text]))('load: %s', (text) => {
    const loaded = loadSite(stringify({ ...base, ...(parse(text) as object) }), '/srv/humledger/site.yaml');
    expect(loaded.ok ? [] : loaded.problems).toEqual([]);
    expect(text).not.toMatch(/[{}]/);
  });

  it('name only keys that there are', () => {
    const schema = readFileSync('config/site.schema.json', 'utf8');
    for (const key of [
      'skip_start',
      'false_peaks',
      'incomplete_after',
      'say_again_at',
      'polling',
      'formerly',
    ]) {
      expect(readme).toContain(key);
      expect(schema).toContain(`"${key}"`);
    }
  });

  it('and the sidecar is one', () => {
    const [json = ''] = textsOf('json');
    expect(parseSidecar(new TextEncoder().encode(json))).toMatchObject({ speedRpm: 1480, loadPercent: 75 });
  });

  it('every quality flag has its line', () => {
    const table = readme.slice(readme.indexOf('| flag | means |'), readme.indexOf('## Commands'));
    const named = Array.from(table.matchAll(/`([a-z-]+)`(?=[^|]*\|[^|]*\|$)/gm), ([, flag = '']) => flag);
    expect(named.filter((name) => !['skip_start'].includes(name)).sort()).toEqual([...qualityFlags].sort());
  });
});

describe('JSON as README describes it', () => {
  let site: SmallSite;
  beforeAll(async () => {
    site = await livedInSite();
  });
  afterAll(() => site.remove());

  const ledgerCommand = (...args: readonly string[]): Promise<Ran> =>
    run([...args, '--json', '--site', site.file], { clock: site.clock });

  it.each([
    ['status', ['status']],
    ['alarms', ['alarms']],
    ['alarms --journal', ['alarms', '--journal']],
    ['trend', ['trend', 'pump-2/de-v', 'overall']],
    ['baseline', ['baseline', 'blower-1']],
    ['rehearse', ['rehearse', '--wanted', '1 a month']],
  ] as const)('%s: every key has its word', async (name, args) => {
    const { out } = await ledgerCommand(...args);
    expect(missing(JSON.parse(out), rowOf(name))).toEqual([]);
  });

  it('analyse: every key has its word', async () => {
    const file = 'demo-data/recordings/mixer-3_20260413T120000Z.wav';
    const { out } = await run(['analyse', file, '--site', 'demo-data/site.yaml', '--json', '--spectrum'], {
      workingFolder: process.cwd(),
    });
    const rows = ['analyse', 'its `channels`', 'a band', 'a peak'].map(rowOf).join('\n');
    expect(missing(JSON.parse(out), rows)).toEqual([]);
  });
});

function rowOf(name: string): string {
  const start = [`\n| \`${name}\` |`, `\n| ${name} |`]
    .map((head) => readme.lastIndexOf(head))
    .find((at) => at >= 0);
  if (start === undefined) throw new Error(`README has no row for ${name}`);
  return readme.slice(start + 1, readme.indexOf('\n', start + 1));
}

/** Keys of a JSON value, at any depth, that the text does not name. What the journal gives as a reason is free. */
function missing(value: unknown, text: string): string[] {
  if (Array.isArray(value)) return [...new Set(value.flatMap((one) => missing(one, text)))];
  if (typeof value !== 'object' || value === null) return [];
  return Object.entries(value).flatMap(([key, inner]) => [
    ...(text.includes(`\`${key}\``) ? [] : [key]),
    ...(key === 'reason' ? [] : missing(inner, text)),
  ]);
}
