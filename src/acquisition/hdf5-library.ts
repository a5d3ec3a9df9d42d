/**
 * The HDF5 library in WebAssembly, as little of it as is used here. One instance reads one file at a time; where
 * anything went wrong in it, it is thrown away with all that it holds, so that a damaged file leaves no trace.
 *
 * Memory: the package sets no bound of its own below 2 GiB, and the library allocates what a file claims. So the
 * compiled module is taken once and instantiated with a heap that does not grow beyond `mostHeapBytes`; a claim beyond
 * that fails inside the library, or stops the instance, and is a refusal either way.
 *
 * The files of the computer are out of its reach: it sees what is mounted and nothing else, whatever a file says of
 * links, external storage or virtual data sets.
 */
export interface Hdf5Library {
  readonly HEAPU8: Uint8Array;
  readonly FS: Hdf5FileSystem;
  readonly H5G_GROUP: number;
  readonly H5G_DATASET: number;
  _malloc(bytes: number): number;
  _free(pointer: number): void;
  UTF8ToString(pointer: number, mostBytes?: number): string;
  open(path: string, mode: number, trackOrder: boolean, low: number, high: number): bigint;
  close_file(file: bigint): number;
  get_names(file: bigint, path: string, recursive: boolean): string[];
  get_type(file: bigint, path: string): number;
  get_attribute_names(file: bigint, path: string): string[];
  get_dataset_metadata(file: bigint, path: string): Hdf5Metadata;
  get_dataset_filters(file: bigint, path: string): Hdf5Filter[];
  get_attribute_metadata(file: bigint, path: string, name: string): Hdf5Metadata;
  get_attribute_data(file: bigint, path: string, name: string, into: bigint): number;
  get_dataset_data(
    file: bigint,
    path: string,
    count: readonly bigint[],
    offset: readonly bigint[],
    stride: readonly bigint[],
    into: bigint,
  ): number;
  activate_throwing_error_handler(): number;
}

export interface Hdf5Metadata {
  /** Class of the type: 0 integer, 1 float, 3 text. */
  readonly type: number;
  readonly signed: boolean;
  /** Bytes of one element. */
  readonly size: number;
  readonly vlen: boolean;
  readonly shape: readonly number[] | null;
  readonly chunks: readonly number[] | null;
  readonly total_size: number;
}

export interface Hdf5Filter {
  readonly id: number;
  readonly name: string;
}

/** The part of Emscripten's file system that a mounted file needs. */
export interface Hdf5FileSystem {
  readonly ErrnoError: new (code: number) => Error;
  mkdir(path: string): unknown;
  mount(type: { mount(): Hdf5Node }, options: object, path: string): unknown;
  unmount(path: string): void;
  createNode(parent: Hdf5Node | null, name: string, mode: number, dev: number): Hdf5Node;
}

export interface Hdf5Node {
  readonly id: number;
  readonly mode: number;
  node_ops: object;
  stream_ops: object;
}

export const mostHeapBytes = 256 * 1_048_576;

type Imports = Record<string, Record<string, unknown>>;
type Factory = (options: object) => Promise<Hdf5Library>;

/** The part of WebAssembly that is used, as the language's own types do not know it. */
interface Engine {
  compile(code: Uint8Array): Promise<object>;
  instantiate(code: object, imports: Imports): Promise<object>;
}

const engine = (globalThis as unknown as { readonly WebAssembly: Engine }).WebAssembly;

interface Loaded {
  readonly make: Factory;
  readonly compiled: object;
}

let ready: Hdf5Library | null = null;
let loading: Promise<Loaded> | null = null;

/** Sees to it that `hdf5Library` has an instance to give. */
export async function prepareHdf5(): Promise<void> {
  if (ready !== null) return;
  loading ??= load();
  const library = await instanceOf(await loading);
  library.activate_throwing_error_handler();
  ready = library;
}

/** The prepared instance; throws where `prepareHdf5` was not awaited before. */
export function hdf5Library(): Hdf5Library {
  if (ready === null) throw new Error('the HDF5 library was not prepared');
  return ready;
}

/** The next file gets another instance. */
export function discardHdf5(): void {
  ready = null;
}

const quiet = { print: () => {}, printErr: () => {} };

function instanceOf({ make, compiled }: Loaded): Promise<Hdf5Library> {
  return new Promise((made, failed) => {
    const instantiateWasm = (imports: Imports, done: (instance: object, module: object) => void) => {
      engine.instantiate(compiled, bounded(imports)).then((instance) => done(instance, compiled), failed);
    };
    make({ ...quiet, instantiateWasm }).then(made, failed);
  });
}

/** A request for more memory than the bound is refused, as on a computer that has no more. */
function bounded(imports: Imports): Imports {
  const { env } = imports;
  const grow = env?.emscripten_resize_heap;
  if (env === undefined || typeof grow !== 'function')
    throw new Error('the HDF5 library has no place to bound its memory at');
  env.emscripten_resize_heap = (bytes: number) => (bytes >>> 0 > mostHeapBytes ? 0 : grow(bytes));
  return imports;
}

/**
 * The package compiles its module anew for each instance and shows it to nobody; it is caught on its way to the engine,
 * by a call that never ends.
 */
async function load(): Promise<Loaded> {
  const glue = new URL('./hdf5_util.js', import.meta.resolve('h5wasm'));
  const { default: make } = (await import(glue.href)) as { readonly default: Factory };
  const { instantiate } = engine;
  try {
    const code = await new Promise<Uint8Array>((caught, failed) => {
      engine.instantiate = (bytes) => {
        caught(bytes as Uint8Array);
        return new Promise(() => {});
      };
      make(quiet).catch(failed);
    });
    return { make, compiled: await engine.compile(code) };
  } finally {
    engine.instantiate = instantiate;
  }
}
