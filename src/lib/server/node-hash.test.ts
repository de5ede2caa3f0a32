import fc from 'fast-check';
import { expect, it } from 'vitest';
import { hashBytes, hashText } from '$lib/logbook/bytes';
import { NODE_SHA256 } from './node-hash';

it("gives the digests of the logbook's own", () => {
	fc.assert(
		fc.property(fc.string({ unit: 'binary' }), (text) => {
			expect(NODE_SHA256.text(text)).toBe(hashText(text));
		})
	);
	fc.assert(
		fc.property(fc.uint8Array({ maxLength: 300 }), (bytes) => {
			expect([...NODE_SHA256.bytes(bytes)]).toEqual([...hashBytes(bytes)]);
		})
	);
});
