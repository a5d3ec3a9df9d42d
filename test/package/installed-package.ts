import { execFile } from 'node:child_process';
import { cpSync, existsSync, mkdirSync, mkdtempSync, rmSync, symlinkSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { delimiter, dirname, join, resolve } from 'node:path';

const root = resolve(import.meta.dirname, '../..');
/** What the package is built from. */
const sources = ['src', 'config', 'demo-data', 'package.json', 'tsconfig.json', 'README.md'];

export interface Ended {
  readonly status: number;
  readonly out: string;
  readonly err: string;
}

export interface PackedFile {
  readonly path: string;
}

/** The package in a folder of its own, as `npm install FILE.tgz` leaves it. */
export interface InstalledPackage {
  readonly files: readonly PackedFile[];
  /** Where it was installed into. */
  readonly folder: string;
  /** The built program that was packed. */
  readonly built: string;
  /** Why it could not be installed; null: it was. */
  readonly noRegistry: string | null;
  remove(): void;
}

/** Packs a copy of the sources, so that what lies in the working tree beside them is left alone, and installs that. */
export async function installPackage(): Promise<InstalledPackage> {
  const scratch = mkdtempSync(join(tmpdir(), 'humledger-package-'));
  const remove = () => rmSync(scratch, { recursive: true });
  try {
    const { filename, files } = await pack(scratch);
    const folder = join(scratch, 'installed');
    mkdirSync(folder);
    const flags = ['--prefer-offline', '--no-audit', '--no-fund'];
    // npm's own patience with a registry that does not answer is several minutes.
    const patience = ['--fetch-retries=1', '--fetch-retry-mintimeout=2000', '--fetch-timeout=60000'];
    const installed = await run('npm', ['install', ...flags, ...patience, join(scratch, filename)], folder);
    const noRegistry = installed.status === 0 ? null : registrySilence(installed);
    if (installed.status !== 0 && noRegistry === null) throw new Error(`npm install: ${installed.err}`);
    return { files, folder, built: join(scratch, 'copy/dist'), noRegistry, remove };
  } catch (error) {
    remove();
    throw error;
  }
}

async function pack(scratch: string): Promise<{ filename: string; files: readonly PackedFile[] }> {
  const copy = join(scratch, 'copy');
  mkdirSync(copy);
  for (const name of sources)
    if (existsSync(join(root, name))) cpSync(join(root, name), join(copy, name), { recursive: true });
  symlinkSync(join(root, 'node_modules'), join(copy, 'node_modules'));
  const flags = ['--json', '--loglevel', 'error', '--pack-destination', scratch];
  const packed = await run('npm', ['pack', ...flags], copy);
  if (packed.status !== 0) throw new Error(`npm pack: ${packed.out}\n${packed.err}`);
  // What prepack prints comes ahead of the answer: a list, or an object by package name, as npm's version has it.
  const answer: unknown = JSON.parse(packed.out.slice(packed.out.search(/^[[{]$/m)));
  const [first] = Object.values(answer as object) as { filename: string; files: readonly PackedFile[] }[];
  return first;
}

/** The code of a failure that says nothing about the package. */
function registrySilence({ err }: Ended): string | null {
  const codes = /code (ENOTFOUND|EAI_AGAIN|ECONNREFUSED|ECONNRESET|ETIMEDOUT|ENETUNREACH|ENOTCACHED|E50\d)\b/;
  return codes.exec(err)?.[1] ?? null;
}

/** Runs a program to its end, with the Node that runs the tests ahead of any other. */
export function run(program: string, args: readonly string[], folder: string): Promise<Ended> {
  const path = [join(root, 'node_modules/.bin'), dirname(process.execPath), process.env.PATH ?? ''].join(
    delimiter,
  );
  return new Promise((ended) => {
    execFile(program, args, { cwd: folder, env: { ...process.env, PATH: path } }, (error, out, err) => {
      const status = error === null ? 0 : typeof error.code === 'number' ? error.code : -1;
      ended({ status, out, err: err + (status === -1 ? String(error) : '') });
    });
  });
}
