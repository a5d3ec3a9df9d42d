import { execFileSync } from 'node:child_process';
import { existsSync } from 'node:fs';
import { delimiter, join } from 'node:path';

export interface OtherNode {
  readonly path: string;
  readonly version: string;
}

/** A Node on the path, outside any node_modules, that is older than 22.12; null where there is none. */
export function olderNode(): OtherNode | null {
  for (const folder of (process.env.PATH ?? '').split(delimiter)) {
    const path = join(folder, 'node');
    if (folder.includes('node_modules') || !existsSync(path)) continue;
    const version = execFileSync(path, ['--version'], { encoding: 'utf8' }).trim().slice(1);
    const [major = 0, minor = 0] = version.split('.').map(Number);
    if (major < 22 || (major === 22 && minor < 12)) return { path, version };
  }
  return null;
}
