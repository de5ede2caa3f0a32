import { expect, it } from 'vitest';
import { clockAhead, dayText, lengthText, numbersText, stamped, whenText } from './words';

it('numbers are said as ranges, each once, whatever their order', () => {
	expect(numbersText([])).toBe('');
	expect(numbersText([31, 27, 28, 29, 27])).toBe('27–29, 31');
	expect(numbersText([9, 10, 100])).toBe('9–10, 100');
});

it('part numbers are set as stamped, and what is none stays as read', () => {
	expect(stamped('MS20426AD3-3.5')).toBe('MS20426 AD 3-3.5');
	expect(stamped('MS20470AD4-4')).toBe('MS20470 AD 4-4');
	expect(stamped('ms20470ad4-4')).toBe('MS20470 AD 4-4');
	expect(stamped('the short ones')).toBe('the short ones');
});

it('lengths stay in the unit they were typed in', () => {
	expect(lengthText({ nm: 12_700_000, unit: 'frac' })).toBe('1/2 in');
	expect(lengthText({ nm: 34_925_000, unit: 'frac' })).toBe('1 3/8 in');
	expect(lengthText({ nm: 812_800, unit: 'in' })).toBe('.032 in');
	expect(lengthText({ nm: 1_600_000, unit: 'mm' })).toBe('1.6 mm');
});

it('days and times meant are said in words', () => {
	expect(dayText('2026-03-14')).toBe('Saturday 14 March 2026');
	expect(dayText('2026-03')).toBe('March 2026');
	expect(whenText({ is: 'before', source: 'paper page 12' })).toBe(
		'before this log began, paper page 12'
	);
	expect(whenText({ is: 'about', date: '2025-11' })).toBe('late, for about November 2025');
});

it('a line that waited for a network is no wrong clock; one from the future is', () => {
	const at = '2026-03-14T20:15:00.000+01:00';
	const written = Date.parse(at);
	expect(clockAhead(at, undefined)).toBe(false);
	expect(clockAhead(at, written + 86_400_000)).toBe(false);
	expect(clockAhead(at, written - 9 * 60_000)).toBe(false);
	expect(clockAhead(at, written - 11 * 60_000)).toBe(true);
});
