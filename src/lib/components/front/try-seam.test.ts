import { expect, it } from 'vitest';
import { begun, drive, drivenIn, markFor, nextRun, touched } from './try-seam';

it('drives the next five, and what is left when there are fewer', () => {
	const seam = begun(12, 3);
	expect(nextRun(seam)).toEqual([3, 4, 5, 6, 7]);
	const twice = drive(drive(seam));
	expect(drivenIn(twice)).toBe(12);
	expect(nextRun(twice)).toEqual([]);
	expect(drive(twice)).toEqual(twice);
});

it('takes one hole through all that can happen to it', () => {
	let seam = begun(2, 0);
	const marks = [0, 1, 2, 3, 4].map(() => {
		seam = touched(seam, 1);
		const { state, defect, ring } = markFor(seam[1] ?? 'open');
		return [state, defect, ring, drivenIn(seam)];
	});
	expect(marks).toEqual([
		['driven', false, 'plain', 1],
		['driven', true, 'plain', 1],
		['drilled_out', false, 'plain', 0],
		['driven', false, 'replaced', 1],
		['driven', true, 'plain', 1]
	]);
	expect(seam[0]).toBe('open');
});
