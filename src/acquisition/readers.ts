import { csvReader } from './read-csv.ts';
import { hdf5Reader } from './read-hdf5.ts';
import { npyReader } from './read-npy.ts';
import { universalReader } from './read-universal.ts';
import { wavReader } from './read-wav.ts';
import type { RecordingReader, Refusal } from './recording.ts';

/** The table of formats, in the order in which they are asked. */
export const readers: readonly RecordingReader[] = [
  wavReader,
  npyReader,
  hdf5Reader,
  universalReader,
  csvReader,
];

const expected = 'WAV, CSV, UFF 58, NPY or HDF5 expected';

/**
 * The reader for a file, by its first bytes (`readHead`) and its name; or a refusal 'foreign'. A damaged file of a
 * known format is recognised here and refused as damaged by its reader.
 */
export function readerFor(head: Uint8Array, fileName: string): RecordingReader | Refusal {
  const reader = readers.find((candidate) => candidate.recognise(head, fileName));
  if (reader !== undefined) return reader;
  if (head.length === 0) return { refused: 'foreign', reason: `the file is empty; ${expected}` };
  return { refused: 'foreign', reason: `no reader knows this kind of file; ${expected}` };
}
