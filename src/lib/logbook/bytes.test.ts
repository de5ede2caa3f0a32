import fc from 'fast-check';
import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import {
	base64url,
	canonicalText,
	fromBase64url,
	hashText,
	NotCanonical,
	tidy,
	type Json
} from './bytes';

describe('the bytes of an entry', () => {
	it('are those of RFC 8785 for what both allow', () => {
		expect(
			canonicalText({
				peach: 'This sorting order',
				b: [1, true, null],
				a: { z: 0, '10': 1, '9': 2 }
			})
		).toBe('{"a":{"10":1,"9":2,"z":0},"b":[1,true,null],"peach":"This sorting order"}');
		// RFC 8785 section 3.2.2.2: the string example, less the lone controls JSON.stringify shares with it.
		expect(canonicalText('\u20ac$\u000F\u000aA\'\u0042\u0022\u005c\\"/')).toBe(
			'"€$\\u000f\\nA\'B\\"\\\\\\\\\\"/"'
		);
	});

	it.each([
		['a fraction', 1.5],
		['minus zero', -0],
		['beyond 2^53-1', 2 ** 53],
		['no number', NaN],
		['half a character', '\ud800'],
		['text not in NFC', 'e\u0301'],
		['a key that is not plain', { 'a b': 1 }],
		['a key that poisons objects', JSON.parse('{"__proto__":1}') as Json],
		['undefined', { a: undefined } as unknown as Json]
	])('do not exist for %s', (_, value) => {
		expect(() => canonicalText(value)).toThrow(NotCanonical);
	});

	it('do not exist for what is nested past sixteen levels, however deep', () => {
		const deep = JSON.parse('['.repeat(15_000) + ']'.repeat(15_000)) as Json;
		expect(() => canonicalText(deep)).toThrow(NotCanonical);
	});

	it('are the same for any order of keys, and read back as the same value', () => {
		const key = fc.stringMatching(/^[a-z][A-Za-z0-9_]{0,8}$/);
		const value = fc.letrec<{ json: Json }>((tie) => ({
			json: fc.oneof(
				{ maxDepth: 4 },
				fc.maxSafeInteger().map((n) => n || 0),
				fc.boolean(),
				fc.constant(null),
				fc.string({ unit: 'grapheme' }).map((text) => tidy(text)),
				fc.array(tie('json'), { maxLength: 4 }),
				fc.dictionary(key, tie('json'), { maxKeys: 4 })
			)
		})).json;
		fc.assert(
			fc.property(fc.dictionary(key, value), fc.infiniteStream(fc.nat()), (object, shuffle) => {
				const keys = Object.keys(object).sort(() => ((shuffle.next().value ?? 0) % 3) - 1);
				const shuffled = Object.fromEntries(keys.map((name) => [name, object[name] as Json]));
				const text = canonicalText(object);
				expect(canonicalText(shuffled)).toBe(text);
				expect(canonicalText(JSON.parse(text) as Json)).toBe(text);
			})
		);
	});

	it('hash as SHA-256 does elsewhere, in base64url', () => {
		fc.assert(
			fc.property(fc.string({ unit: 'grapheme' }), (text) => {
				expect(hashText(text)).toBe(createHash('sha256').update(text, 'utf8').digest('base64url'));
			})
		);
	});

	it('go through base64url and back, and no other writing of them is read', () => {
		fc.assert(
			fc.property(fc.uint8Array({ maxLength: 70 }), (bytes) => {
				const text = base64url(bytes);
				expect(text).toBe(Buffer.from(bytes).toString('base64url'));
				expect(fromBase64url(text)).toEqual(new Uint8Array(bytes));
			})
		);
		expect(fromBase64url('AB')).toBeUndefined();
		expect(fromBase64url('A')).toBeUndefined();
		expect(fromBase64url('a+b/')).toBeUndefined();
	});
});
