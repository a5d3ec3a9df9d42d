import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { z } from 'zod';
import { siteJsonSchema } from '../../src/config/schema.ts';
import { exampleText, exampleWith, readList } from './site-parts.ts';

const file = new URL('../../config/site.schema.json', import.meta.url);
const schema = siteJsonSchema();

/** As an editor reads it: YAML 1.2 with its own numbers, against the schema. */
function editorAccepts(text: string): boolean {
  return z.fromJSONSchema(schema as Parameters<typeof z.fromJSONSchema>[0]).safeParse(parse(text)).success;
}

describe('the JSON Schema of the site file', () => {
  it('is up to date; else run: npx node src/config/write-schema.ts', () => {
    expect(JSON.parse(readFileSync(file, 'utf8'))).toEqual(schema);
  });

  it('accepts what the program accepts, also where YAML sees a number', () => {
    expect(editorAccepts(exampleText)).toBe(true);
    expect(editorAccepts(readList('shortest.yaml'))).toBe(true);
    expect(editorAccepts(exampleWith(['- id: de-h', '- id: 0012'], ["at: '06:30'", 'at: 06:30']))).toBe(true);
  });

  it('refuses what an editor can see', () => {
    expect(editorAccepts(exampleWith(['window: hann', 'window: haning']))).toBe(false);
    expect(editorAccepts(exampleWith(['alert: 2.8', 'alrt: 2.8']))).toBe(false);
    expect(editorAccepts(exampleWith(['time_zone: Europe/Dublin\n', '']))).toBe(false);
    expect(editorAccepts(exampleWith(['from: 10 Hz', "from: '10'"]))).toBe(false);
  });

  it('describes every key', () => {
    const silent: string[] = [];
    const walk = (node: unknown, path: string) => {
      if (typeof node !== 'object' || node === null) return;
      const { properties = {}, items, additionalProperties, anyOf } = node as Record<string, object>;
      for (const [name, property] of Object.entries(properties as Record<string, { description?: string }>)) {
        if (!property.description?.endsWith('.')) silent.push(`${path}.${name}`);
        walk(property, `${path}.${name}`);
      }
      walk(items, `${path}[]`);
      walk(additionalProperties, `${path}{}`);
      for (const [n, one] of Object.entries(anyOf ?? {})) walk(one, `${path}|${n}`);
    };
    walk(schema, '');
    expect(silent).toEqual([]);
  });
});
