import {
  type Hdf5Filter,
  type Hdf5Library,
  type Hdf5Metadata,
  type Hdf5Node,
  hdf5Library,
} from './hdf5-library.ts';
import type { ByteSource } from './recording.ts';
import type { SampleNumber } from './sample-numbers.ts';

/** A data set of real numbers. */
export interface Hdf5Dataset {
  readonly path: string;
  readonly number: SampleNumber;
  readonly sides: readonly number[];
  /** Sides of one piece in which it is stored and compressed; null: in one run. */
  readonly chunk: readonly number[] | null;
  /** What it was packed with that is not read here; null: nothing. */
  readonly strangeFilter: string | null;
}

/** An open file. What the library throws, a stopped instance among it, becomes `Hdf5Trouble`. */
export interface Hdf5File {
  kind(path: string): 'group' | 'dataset' | 'other';
  /** Paths below a group, those of the groups in it too where `recursive`. */
  names(path: string, recursive: boolean): readonly string[];
  /** In words where it is no array of real numbers. */
  dataset(path: string): Hdf5Dataset | string;
  /** A number or a text of an object; null where it has none of that name or it is anything else. */
  attribute(path: string, name: string): number | string | null;
  /** The elements from `from` on, `count` of them along each side, in row order and little-endian; in a buffer of their own. */
  read(dataset: Hdf5Dataset, from: readonly number[], count: readonly number[]): Uint8Array;
  /** Leaves the instance of the library ready for the next file. */
  close(): void;
}

/** The library could not read on; `message` is its innermost reason. */
export class Hdf5Trouble extends Error {}

const mountPoint = '/recording';
const longestAttribute = 4096;
const longestText = 80;
let mounts = 0;

/**
 * Opens a file over its source; throws `Hdf5Trouble` where the library cannot read it. What the source throws, a disk
 * that fails, comes through as it is: it says nothing against the file.
 */
export function openHdf5(source: ByteSource): Hdf5File {
  const library = hdf5Library();
  let failure: { readonly error: unknown } | null = null;
  const read: ByteSource['read'] = (offset, into) => {
    try {
      return source.read(offset, into);
    } catch (error) {
      failure = { error };
      throw error;
    }
  };
  const guarded: Guarded = (call) => {
    try {
      return call();
    } catch (error) {
      if (failure !== null) throw failure.error;
      throw new Hdf5Trouble(innermost(error));
    }
  };
  mount(library, { size: source.size, read });
  const file = guarded(() => library.open(`${mountPoint}/file`, 0, false, -1, -1));
  return openFile(library, file, guarded);
}

/** Calls into the library, and makes one kind of error of all that it throws. */
type Guarded = <T>(call: () => T) => T;

/** Of the library's stack of messages the last, which is nearest to the cause. */
function innermost(error: unknown): string {
  const text = error instanceof Error || hasMessage(error) ? error.message : String(error);
  const messages = [...text.matchAll(/^ *#\d+:.*?\(\): (.*)$/gm)];
  const last = messages.at(-1)?.[1] ?? `the HDF5 library stopped (${text.split('\n')[0]})`;
  // A failed read is dated by the library, and told with its file and addresses.
  return last
    .replace(/: time = .*/, '')
    .replace(/[^ -~]/g, '?')
    .slice(0, 160);
}

function hasMessage(error: unknown): error is { readonly message: string } {
  return typeof error === 'object' && error !== null && typeof Reflect.get(error, 'message') === 'string';
}

/** A folder with the one file in it, whose bytes come from the source as they are asked for. */
function mount({ FS }: Hdf5Library, source: ByteSource): void {
  // Another number each time: the library takes equal ones for the same file.
  const dev = ++mounts;
  const attributes = (size: number) => (node: Hdf5Node) => ({
    dev,
    ino: node.id,
    mode: node.mode,
    nlink: 1,
    uid: 0,
    gid: 0,
    rdev: 0,
    size,
    atime: new Date(0),
    mtime: new Date(0),
    ctime: new Date(0),
    blksize: 4096,
    blocks: Math.ceil(size / 512),
  });
  const noSuchFile = 44;
  const wrongArgument = 28;
  try {
    FS.mkdir(mountPoint);
  } catch {
    // Mounted before by this instance.
  }
  const make = (): Hdf5Node => {
    const folder = FS.createNode(null, '/', 0o040555, 0);
    const lookup = () => {
      throw new FS.ErrnoError(noSuchFile);
    };
    folder.node_ops = { getattr: attributes(0), lookup };
    folder.stream_ops = {};
    const file = FS.createNode(folder, 'file', 0o100444, 0);
    file.node_ops = { getattr: attributes(source.size) };
    file.stream_ops = {
      llseek(stream: { readonly position: number }, offset: number, whence: number) {
        const at = offset + (whence === 1 ? stream.position : whence === 2 ? source.size : 0);
        if (at < 0) throw new FS.ErrnoError(wrongArgument);
        return at;
      },
      read: (_: object, heap: Uint8Array, at: number, length: number, position: number) =>
        position >= source.size ? 0 : source.read(position, heap.subarray(at, at + length)),
    };
    return folder;
  };
  FS.mount({ mount: make }, {}, mountPoint);
}

function openFile(library: Hdf5Library, file: bigint, guarded: Guarded): Hdf5File {
  const inHeap = <T>(bytes: number, use: (pointer: number) => T): T => {
    const pointer = library._malloc(bytes);
    if (pointer === 0) throw new Hdf5Trouble(`no room for ${bytes} bytes`);
    try {
      return use(pointer);
    } finally {
      library._free(pointer);
    }
  };
  return {
    kind: (path) =>
      guarded(() => {
        const type = library.get_type(file, path);
        return type === library.H5G_GROUP ? 'group' : type === library.H5G_DATASET ? 'dataset' : 'other';
      }),
    close: () => {
      guarded(() => library.close_file(file));
      library.FS.unmount(mountPoint);
    },
    names: (path, recursive) => guarded(() => library.get_names(file, path, recursive)),
    dataset: (path) =>
      guarded(() => {
        const filters = library.get_dataset_filters(file, path);
        return describe(path, library.get_dataset_metadata(file, path), filters);
      }),
    attribute: (path, name) =>
      guarded(() => {
        if (!library.get_attribute_names(file, path).includes(name)) return null;
        const metadata = library.get_attribute_metadata(file, path, name);
        const bytes = metadata.size * metadata.total_size;
        if (metadata.total_size !== 1 || !(bytes > 0 && bytes <= longestAttribute)) return null;
        return inHeap(bytes, (pointer) => {
          if (library.get_attribute_data(file, path, name, BigInt(pointer)) < 0) return null;
          return attributeValue(library, metadata, pointer);
        });
      }),
    read: (dataset, from, count) =>
      guarded(() => {
        const bytes = count.reduce((product, side) => product * side, dataset.number.bytes);
        return inHeap(bytes, (pointer) => {
          const [counts, offsets] = [count.map(BigInt), from.map(BigInt)];
          const ones = count.map(() => 1n);
          const status = library.get_dataset_data(file, dataset.path, counts, offsets, ones, BigInt(pointer));
          if (status < 0) throw new Error('the HDF5 library could not read the samples');
          return library.HEAPU8.slice(pointer, pointer + bytes);
        });
      }),
  };
}

const classInteger = 0;
const classFloat = 1;
const classText = 3;

/** The library's own: gzip, shuffle, checksum, n bit, scale and offset. */
const knownFilters = [1, 2, 3, 5, 6];

function describe(
  path: string,
  { type, signed, size, shape, chunks }: Hdf5Metadata,
  filters: readonly Hdf5Filter[],
): Hdf5Dataset | string {
  const kind =
    type === classFloat ? 'float' : type === classInteger ? (signed ? 'signed' : 'unsigned') : null;
  if (kind === null) return 'it holds no plain numbers';
  const possible = kind === 'float' ? [4, 8] : [1, 2, 4, 8];
  if (!possible.includes(size)) return `it holds numbers of ${8 * size} bits`;
  if (shape === null || !shape.every(Number.isSafeInteger)) return 'it holds nothing';
  const number: SampleNumber = { kind, bytes: size as SampleNumber['bytes'], littleEndian: true };
  const strange = filters.find(({ id }) => !knownFilters.includes(id));
  const strangeFilter = strange === undefined ? null : strange.name || `filter ${strange.id}`;
  return { path, number, sides: shape, chunk: chunks, strangeFilter };
}

function attributeValue(
  library: Hdf5Library,
  { type, signed, size, vlen }: Hdf5Metadata,
  pointer: number,
): number | string | null {
  const view = new DataView(library.HEAPU8.buffer, pointer, size);
  if (type === classFloat && size === 8) return view.getFloat64(0, true);
  if (type === classFloat && size === 4) return view.getFloat32(0, true);
  if (type === classInteger && [1, 2, 4, 8].includes(size)) {
    const bits = 8 * size;
    const value = [...library.HEAPU8.subarray(pointer, pointer + size)].reduceRight(
      (sum, byte) => sum * 256n + BigInt(byte),
      0n,
    );
    return Number(signed ? BigInt.asIntN(bits, value) : value);
  }
  if (type !== classText) return null;
  const text = vlen
    ? library.UTF8ToString(view.getUint32(0, true), longestText)
    : library.UTF8ToString(pointer, Math.min(size, longestText));
  return text.trim();
}
