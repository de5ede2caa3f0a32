import { describe, expect, it } from 'vitest';
import { holesNumbered, numbersOf, parseNumbers, plannedHoles } from './hole-numbers';

const says = (text: string) => {
	const read = parseNumbers(text);
	return read.ok ? read.ranges : read.says;
};

describe('hole numbers', () => {
	it.each([
		[
			'12-18, 20',
			[
				[12, 18],
				[20, 20]
			]
		],
		[
			'12–18 20',
			[
				[12, 18],
				[20, 20]
			]
		],
		['12 to 18', [[12, 18]]],
		[
			' 5;7 ',
			[
				[5, 5],
				[7, 7]
			]
		]
	])('reads %j', (text, ranges) => {
		expect(says(text)).toEqual(ranges);
	});

	it('says what would do instead', () => {
		expect(says('')).toBe('Write the hole numbers, like 12-18 or 5, 7.');
		expect(says('rib 4')).toBe('“rib” is not a hole number. Write 12-18 or 5, 7.');
		expect(says('18-12')).toBe('18-12 runs backwards. Write 12-18.');
	});

	it('finds each hole once, whatever the ranges overlap', () => {
		const found = holesNumbered('2-4, 3', plannedHoles(5, 1));
		expect(found.ok && found.holes.map(({ index }) => index)).toEqual([2, 3, 4]);
	});

	it('does not count to the end of an absurd range before it says so', () => {
		expect(holesNumbered('1-9999999', plannedHoles(3, 1))).toEqual({
			ok: false,
			says: 'There is no hole 4 on this seam.'
		});
	});

	it('means both holes by a number that two carry', () => {
		const twins = [
			{ index: 7, number: 7 },
			{ by: 'x', index: 1, number: 7 }
		];
		const found = holesNumbered('7', twins);
		expect(found.ok && found.holes).toEqual(twins);
	});

	it('writes the numbers of holes named by identity', () => {
		expect(numbersOf([{ from: 2, to: 3 }], plannedHoles(5, 101))).toBe('102–103');
	});
});
