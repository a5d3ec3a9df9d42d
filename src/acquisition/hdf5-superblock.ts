import { readFully } from './byte-source.ts';
import type { ByteSource, Refusal } from './recording.ts';

const signature = [0x89, 0x48, 0x44, 0x46, 0x0d, 0x0a, 0x1a, 0x0a];

/** The signature stands at the begin or at 512, 1024, 2048, ... bytes behind it; -1 where it is in none of them. */
export function hdf5SignatureAt(head: Uint8Array): number {
  for (let at = 0; at + signature.length <= head.length; at = at === 0 ? 512 : 2 * at)
    if (signature.every((byte, n) => head[at + n] === byte)) return at;
  return -1;
}

/** Whether these first bytes may still become the signature. */
export function beginsHdf5(head: Uint8Array): boolean {
  return head.subarray(0, signature.length).every((byte, n) => byte === signature[n]);
}

const longest = 128;
const openForWriting = 1;

/**
 * What the superblock says of the whole file (HDF5 File Format Specification, II.A): how many bytes it has when it is
 * complete, and whether its writer still has it open. Null where the file ends within the superblock or its size is not
 * written yet. It is read here so that a file that is still being copied is told from a damaged one.
 */
export function hdf5Superblock(
  source: ByteSource,
  at: number,
): { readonly endsAt: number; readonly openForWriting: boolean } | Refusal | null {
  const bytes = new Uint8Array(longest);
  const count = readFully(source, at, bytes);
  if (count < 16) return null;
  const version = bytes[8] as number;
  if (version > 3) return { refused: 'unsupported', reason: `version ${version} of the HDF5 superblock` };
  const old = version < 2;
  const offsetBytes = bytes[old ? 13 : 9] as number;
  if (offsetBytes !== 4 && offsetBytes !== 8)
    return { refused: 'damaged', reason: `the superblock has addresses of ${offsetBytes} bytes` };
  // Base, free space (old) or extension (new), then the end of the file, counted from its first byte.
  const addresses = version === 0 ? 24 : version === 1 ? 28 : 12;
  const endAt = addresses + 2 * offsetBytes;
  if (count < endAt + offsetBytes) return null;
  const endsAt = address(bytes, endAt, offsetBytes);
  const flags = version === 3 ? (bytes[11] as number) : 0;
  if (endsAt === null) return null;
  return { endsAt, openForWriting: (flags & openForWriting) !== 0 };
}

/** Null: all bits set, the undefined address. */
function address(bytes: Uint8Array, at: number, length: number): number | null {
  const part = bytes.subarray(at, at + length);
  if (part.every((byte) => byte === 0xff)) return null;
  return part.reduceRight((sum, byte) => sum * 256 + byte, 0);
}
