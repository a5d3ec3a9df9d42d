import { it } from 'vitest';
import { manyKept } from './many-kept.ts';

it('of 100,000 kept files only those that changed, and new ones, are opened', () => manyKept(100_000, 100));
