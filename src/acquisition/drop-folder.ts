/**
 * The drop folder of a running service. The sweep is the truth: it walks the folder and says everything it found. The
 * watcher only hints that a sweep is worth it now; a watcher loses events without a word when its folder is taken
 * away and comes back, so it is made anew whenever a sweep finds another folder (device or inode) in the place, or
 * found none before.
 */
import { type FSWatcher, watch } from 'chokidar';
import { type LeftAlone, type SeenFile, type Sweep, sweepFolder, usualBounds } from './sweep.ts';

export interface DropFolderSettings {
  readonly folder: string;
  readonly except: readonly string[];
  /** Look by polling: network shares give no events. */
  readonly polling: boolean;
  /** Something may have changed; called as often as events come. */
  readonly hint: () => void;
}

/** The drop folder of a running service: sweeps, tells what is left alone once, and keeps the watcher alive. */
export class DropFolder {
  readonly #settings: DropFolderSettings;
  #watcher: FSWatcher | null = null;
  #watched: string | null = null;
  #told = new Set<string>();
  #closed = false;

  constructor(settings: DropFolderSettings) {
    this.#settings = settings;
  }

  /** As `sweepFolder`, with its usual bounds, but `leftAlone` holds only what earlier sweeps have not told. */
  async sweep(isKnown: (file: SeenFile) => boolean = () => false): Promise<Sweep> {
    const { folder, except } = this.#settings;
    const sweep = await sweepFolder(folder, except, usualBounds, isKnown);
    await this.#watch(sweep.state === 'read' ? sweep.folderInode : null);
    if (sweep.state !== 'read') return sweep;
    const key = ({ path, reason }: LeftAlone) => `${path}\n${reason}`;
    const news = sweep.leftAlone.filter((entry) => !this.#told.has(key(entry)));
    this.#told = new Set(sweep.leftAlone.map(key));
    return { ...sweep, leftAlone: news };
  }

  async close(): Promise<void> {
    this.#closed = true;
    await this.#watch(null);
  }

  /** Watches the folder with this inode, or none. */
  async #watch(inode: string | null): Promise<void> {
    if (this.#watched === inode) return;
    const old = this.#watcher;
    this.#watcher = null;
    this.#watched = inode;
    await old?.close();
    if (inode === null || this.#closed) return;
    const { folder, polling, hint } = this.#settings;
    this.#watcher = watch(folder, {
      ignoreInitial: true,
      followSymlinks: false,
      usePolling: polling,
      depth: usualBounds.deepest,
      ignorePermissionErrors: true,
    });
    this.#watcher.on('all', hint);
    // What came between the sweep and the first watched moment.
    this.#watcher.on('ready', hint);
    // The next sweep makes the watcher anew; no hint from here, or a lasting error would turn in circles.
    this.#watcher.on('error', () => {
      this.#watched = null;
    });
  }
}
