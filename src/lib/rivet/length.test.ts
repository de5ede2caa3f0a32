import fc from 'fast-check';
import { expect, test } from 'vitest';
import {
	formatLength,
	NM_PER_64TH,
	NM_PER_CENTIMILLIMETRE,
	NM_PER_THOU,
	parseLength,
	type Length
} from './length';

const read = (text: string, bare?: 'in' | 'mm'): Length => {
	const result = parseLength(text, bare);
	if (!result.ok) throw new Error(result.says);
	return result.length;
};
const says = (text: string, bare?: 'in' | 'mm'): string => {
	const result = parseLength(text, bare);
	return result.ok ? '' : result.says;
};

test.each<[string, Length]>([
	['1-3/8"', { nm: 88 * NM_PER_64TH, unit: 'frac' }],
	['1 3/8', { nm: 88 * NM_PER_64TH, unit: 'frac' }],
	['1 - 3/8 in', { nm: 88 * NM_PER_64TH, unit: 'frac' }],
	['1½ in', { nm: 96 * NM_PER_64TH, unit: 'frac' }],
	['⅜', { nm: 24 * NM_PER_64TH, unit: 'frac' }],
	['3/64″', { nm: 3 * NM_PER_64TH, unit: 'frac' }],
	['2 inches', { nm: 128 * NM_PER_64TH, unit: 'frac' }],
	['.040', { nm: 40 * NM_PER_THOU, unit: 'in' }],
	['0.040 in', { nm: 40 * NM_PER_THOU, unit: 'in' }],
	['0,040 in.', { nm: 40 * NM_PER_THOU, unit: 'in' }],
	['.3125"', { nm: 20 * NM_PER_64TH, unit: 'in' }],
	['1.2 mm', { nm: 120 * NM_PER_CENTIMILLIMETRE, unit: 'mm' }],
	['1,2 mm', { nm: 120 * NM_PER_CENTIMILLIMETRE, unit: 'mm' }],
	['1.2MM', { nm: 120 * NM_PER_CENTIMILLIMETRE, unit: 'mm' }],
	['0', { nm: 0, unit: 'frac' }]
])('%s is read', (text, length) => {
	expect(read(text)).toEqual(length);
});

test('a number without a unit takes the unit of the build, a fraction is always of an inch', () => {
	expect(read('1.2', 'mm')).toEqual({ nm: 1_200_000, unit: 'mm' });
	expect(read('3', 'mm')).toEqual({ nm: 3_000_000, unit: 'mm' });
	expect(read('3/8', 'mm')).toEqual({ nm: 24 * NM_PER_64TH, unit: 'frac' });
});

test('what cannot be read is refused in a sentence that says what would do', () => {
	expect(says('')).toBe('Nothing was typed. Write a length like 3/8, .040 or 1.2 mm.');
	expect(says('abc')).toBe('“abc” is not a length. Write one like 1-3/8, .040 in or 1.2 mm.');
	expect(says('1/3')).toBe(
		'“1/3” is a fraction over 3. Write halves, 4ths, 8ths, 16ths, 32nds or 64ths, or a decimal like .040.'
	);
	expect(says('3/8 mm')).toBe(
		'“3/8 mm” is a fraction in millimetres. Write a decimal, like 1.2 mm.'
	);
	expect(says('1,234 mm')).toBe(
		'“1,234 mm” could be 1.234 or 1234. Write it with a point, or without the comma.'
	);
	expect(says('-1/8')).toBe(
		'“-1/8” is less than nothing. Write a length like 3/8, .040 or 1.2 mm.'
	);
	expect(says('200000 mm')).toBe('“200000 mm” is more than 100 m. Check the number and its unit.');
	for (const text of [
		'1/0',
		'1//8',
		'1.2.3',
		'1 2 3/8',
		'1e3',
		'NaN',
		'3 cm',
		'1.',
		'.',
		'"',
		'mm'
	])
		expect(says(text), text).not.toBe('');
});

test('lengths are written as the trade writes them', () => {
	expect(formatLength(read('1-24/64'))).toBe('1-3/8 in');
	expect(formatLength(read('64/64'))).toBe('1 in');
	expect(formatLength(read('1/64'))).toBe('1/64 in');
	expect(formatLength(read('.04'))).toBe('.040 in');
	expect(formatLength(read('.3125'))).toBe('.3125 in');
	expect(formatLength(read('1.25'))).toBe('1.250 in');
	expect(formatLength(read('0.0', 'mm'))).toBe('0 mm');
	expect(formatLength(read('10 mm'))).toBe('10 mm');
	expect(formatLength(read('1,20 mm'))).toBe('1.2 mm');
	expect(formatLength({ nm: 25_399_999, unit: 'in' })).toBe('1.000 in');
});

const STEP = { frac: NM_PER_64TH, in: NM_PER_THOU, mm: NM_PER_CENTIMILLIMETRE } as const;
const anyLength = fc.record({
	nm: fc.integer({ min: 0, max: 99_999_000_000 }),
	unit: fc.constantFrom('frac' as const, 'in' as const, 'mm' as const)
});

test('a length written and read again is off by half a step at most, in the same unit', () => {
	fc.assert(
		fc.property(anyLength, (length) => {
			const again = read(formatLength(length), length.unit === 'mm' ? 'in' : 'mm');
			expect(again.unit).toBe(length.unit);
			expect(Math.abs(again.nm - length.nm) * 2).toBeLessThanOrEqual(STEP[length.unit]);
		})
	);
});

test('a length of whole steps is written and read again exactly', () => {
	fc.assert(
		fc.property(
			fc.integer({ min: 0, max: 250_000 }),
			fc.constantFrom('frac' as const, 'in' as const, 'mm' as const),
			(steps, unit) => {
				const length = { nm: steps * STEP[unit], unit };
				expect(read(formatLength(length))).toEqual(length);
			}
		)
	);
});

test('no text makes the reader throw, and what it reads fits an entry', () => {
	fc.assert(
		fc.property(fc.string({ unit: 'grapheme' }), (text) => {
			const result = parseLength(text);
			if (!result.ok) expect(result.says).toMatch(/\.$/);
			else {
				expect(Number.isSafeInteger(result.length.nm)).toBe(true);
				expect(result.length.nm).toBeGreaterThanOrEqual(0);
				expect(result.length.nm).toBeLessThanOrEqual(100_000_000_000);
			}
		})
	);
});
