import { isMap, isPair, isScalar } from 'yaml';
import { asYaml, type Span } from './site-text.ts';

/**
 * Inside braces a comma ends a value: `{ alert: 2,8 mm/s }` is a key `alert` of '2' and a key '8 mm/s' without value.
 * Where pair `index` of a map was cut like that, the whole text as it was meant, and its span.
 */
export function splitAtComma(
  map: unknown,
  index: number,
  text: string,
): { readonly span: Span; readonly whole: string; readonly pieces: number } | null {
  if (!isMap(map) || map.flow !== true) return null;
  const value = map.items[index].value;
  if (!isScalar(value) || value.type !== 'PLAIN' || !value.range) return null;
  let end = value.range[1];
  let pieces = 0;
  for (let next = index + 1; next < map.items.length; next++) {
    const pair: unknown = map.items[next];
    if (!isPair(pair) || pair.value !== null || !isScalar(pair.key) || !pair.key.range) break;
    end = pair.key.range[1];
    pieces++;
  }
  if (pieces === 0) return null;
  const span = { from: value.range[0], to: end };
  return { span, whole: text.slice(span.from, span.to).replace(/\s+/g, ' '), pieces };
}

/** What the cut text should have been: a decimal comma becomes a point, any other text is quoted. */
export function remedyForComma(whole: string): { readonly what: string; readonly replacement: string } {
  const decimal = /^([+-]?\d+),(\d+)(?!.*,)(.*)$/s.exec(whole);
  if (decimal !== null) {
    return {
      what: `the comma ends the value inside braces; '${whole}' has a decimal comma, numbers take a point`,
      replacement: `${decimal[1]}.${decimal[2]}${decimal[3]}`,
    };
  }
  return {
    what: 'the comma ends the value inside braces, the rest becomes a key',
    replacement: asYaml(whole, true),
  };
}

/** `name: Pump #2`: what a comment took from a plain text, or null. A '# ' with a space after it is meant as a comment. */
export function eatenByComment(
  node: unknown,
  text: string,
): { readonly span: Span; readonly whole: string } | null {
  if (!isScalar(node) || !node.range || (node.type !== 'PLAIN' && node.value !== '')) return null;
  const [from, end] = node.range;
  const eaten = /^ ?#[^\s#][^\n\r]*/.exec(text.slice(end, end + 300))?.[0];
  if (eaten === undefined || (eaten[0] === '#' && text[end - 1] !== ' ')) return null;
  const to = end + eaten.trimEnd().length;
  return { span: { from, to }, whole: text.slice(from, to).trim() };
}
