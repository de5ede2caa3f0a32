import { readFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import * as z from 'zod/mini';
import { KINDS } from './kinds';

/**
 * Bodies are frozen: phones in hangars hold lines of these shapes, and their signatures, for ever. This file changes only
 * by added lines, for added versions. A test that fails here means that a body was edited.
 */
const FROZEN = 'tests/fixtures/kinds-frozen.json';

it('keeps every body, once shipped, as it was', () => {
	const frozen = JSON.parse(readFileSync(FROZEN, 'utf8')) as Record<string, unknown>;
	const shapes = Object.entries(KINDS).map(([name, { body, ...traits }]) => [
		name,
		{ body: z.toJSONSchema(body), ...traits }
	]);
	expect(JSON.parse(JSON.stringify(Object.fromEntries(shapes)))).toEqual(frozen);
});
