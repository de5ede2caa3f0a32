import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import { Scribe } from '../../../tests/support/scribe';
import { hashText } from './bytes';
import { digestOf, materialOf } from './signoff';

describe('a sign-off', () => {
	it('covers material lines and their strikes, and nothing else', () => {
		const scribe = new Scribe();
		const seam = scribe.seam(5);
		const run = scribe.drive(seam, 1, 2);
		const note = scribe.write('note.written', { text: 'nice evening' }, { seam });
		const strikes = [scribe.strike(run), scribe.strike(note)];
		expect(materialOf(scribe.lines)).toEqual([seam, run.id, strikes[0]?.id].sort());
	});

	it('has a digest that ten lines elsewhere recompute, whatever the order', () => {
		const covered = ['b', 'a', 'c'].map((id) => ({ id, hash: hashText(id) }));
		const sum = createHash('sha256');
		sum.update('tallybar digest 1');
		for (const id of ['a', 'b', 'c'])
			sum.update(`\n${createHash('sha256').update(id).digest('base64url')}`);
		expect(digestOf(covered)).toBe(sum.digest('base64url'));
		expect(digestOf([...covered].reverse())).toBe(digestOf(covered));
	});
});
