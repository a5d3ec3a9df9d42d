/**
 * Names of files as they come from outside: what is wrong with one, how it is shown, how it is kept in a text
 * column, and how it is made to fit where a suffix must still go behind it.
 */

/** Longest name that Linux file systems hold, in bytes. */
export const longestNameBytes = 255;

/** Longest name under which a file is filed: leaves room for `~` and 8 digits, `.reason.txt` or `.part`. */
export const longestFiledNameBytes = 232;

/** How the stored spelling of a path begins that is no clean text. */
export const codedPrefix = 'bytes:';

/** What is wrong with one name (not a path), or null. */
export function nameProblem(bytes: Uint8Array): string | null {
  if (bytes.length > longestNameBytes)
    return `its name has ${bytes.length} bytes, more than ${longestNameBytes}`;
  const text = decode(bytes);
  if (text === null) return 'its name is not UTF-8';
  if (/[\p{Cc}\p{Zl}\p{Zp}]/u.test(text)) return 'its name holds control characters';
  // Marks that turn the reading direction make a name look like another one.
  if (/[\u202a-\u202e\u2066-\u2069]/u.test(text))
    return 'its name holds marks that turn the reading direction';
  return null;
}

/**
 * A relative path as text that can be stored and turned back: the path itself where it is clean, otherwise
 * `bytes:` and its bytes in hexadecimal.
 */
export function pathText(bytes: Uint8Array): string {
  const text = decode(bytes);
  if (text === null || text.startsWith(codedPrefix) || /[\p{Cc}\p{Zl}\p{Zp}]/u.test(text)) {
    return codedPrefix + Buffer.from(bytes).toString('hex');
  }
  return text;
}

/** The bytes that `pathText` was made from. */
export function pathBytes(text: string): Buffer {
  return text.startsWith(codedPrefix)
    ? Buffer.from(text.slice(codedPrefix.length), 'hex')
    : Buffer.from(text, 'utf8');
}

/** A name as people may safely be shown it: control characters and stray bytes as `\x0a`, at most 120 characters. */
export function printableName(text: string): string {
  const readable = text.startsWith(codedPrefix) ? readableBytes(pathBytes(text)) : text;
  const escaped = readable.replace(
    /[\p{Cc}\p{Zl}\p{Zp}\u202a-\u202e\u2066-\u2069]/gu,
    (mark) => `\\x${mark.charCodeAt(0).toString(16).padStart(2, '0')}`,
  );
  return escaped.length <= 120 ? escaped : `${escaped.slice(0, 80)}...${escaped.slice(-37)}`;
}

/** Name under which a file with an unusable name is filed; keeps an ending of up to four plain letters or digits. */
export function madeUpName(bytes: Uint8Array, sha256: string): string {
  const ending = /\.[A-Za-z0-9]{1,4}$/.exec(Buffer.from(bytes).toString('latin1'))?.[0] ?? '';
  return `unnamed-${sha256.slice(0, 8)}${ending}`;
}

/** What stands behind the last / of a path. */
export function nameOf(path: string): string {
  return path.slice(path.lastIndexOf('/') + 1);
}

/** Splits a name before its last dot; a leading dot is no ending. */
export function splitEnding(name: string): { readonly stem: string; readonly ending: string } {
  const dot = name.lastIndexOf('.');
  return dot > 0 ? { stem: name.slice(0, dot), ending: name.slice(dot) } : { stem: name, ending: '' };
}

/** The name itself, or its stem cut at a whole character so that the name has at most so many bytes. */
export function fitName(name: string, bytes: number = longestFiledNameBytes): string {
  if (Buffer.byteLength(name) <= bytes) return name;
  let { stem, ending } = splitEnding(name);
  if (Buffer.byteLength(ending) > 16) [stem, ending] = [name, ''];
  const letters = Array.from(stem);
  while (Buffer.byteLength(letters.join('') + ending) > bytes) letters.pop();
  return letters.join('') + ending;
}

/** Name for a second file of one name: the mark is the beginning of its content's hash, behind the whole name. */
export function markedName(name: string, sha256: string): string {
  return `${name}~${sha256.slice(0, 8)}`;
}

/**
 * Name of the sidecar that belongs to a recording's name: its ending gives way to `.json`; a mark of `markedName`
 * is kept (`a.wav~1a2b3c4d` has `a~1a2b3c4d.json`).
 */
export function sidecarNameOf(name: string): string {
  const mark = /~[0-9a-f]{8}(~[2-9])?$/.exec(name)?.[0] ?? '';
  return `${splitEnding(name.slice(0, name.length - mark.length)).stem}${mark}.json`;
}

function decode(bytes: Uint8Array): string | null {
  try {
    return new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(bytes);
  } catch {
    return null;
  }
}

function readableBytes(bytes: Uint8Array): string {
  return decode(bytes) ?? Buffer.from(bytes).toString('latin1');
}
