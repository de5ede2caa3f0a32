import fc from 'fast-check';
import { expect, test } from 'vitest';
import { readCsv } from './csv';

test('quotes keep commas, quotes and line ends; the last line end is optional', () => {
	expect(readCsv('a,"b, ""c""",\r\n"x\ny",,z\n')).toEqual([
		['a', 'b, "c"', ''],
		['x\ny', '', 'z']
	]);
	expect(readCsv('a,b\nc,')).toEqual([
		['a', 'b'],
		['c', '']
	]);
	expect(readCsv('')).toEqual([]);
});

test('a quote in the wrong place is an error', () => {
	for (const text of ['"a', 'a"b,c', '"a"b\n', 'x,"'])
		expect(() => readCsv(text), text).toThrow('quoted field');
});

test('whatever is written with every field quoted is read again', () => {
	const table = fc.array(fc.array(fc.string(), { minLength: 1, maxLength: 5 }), { maxLength: 5 });
	fc.assert(
		fc.property(table, (rows) => {
			const text = rows
				.map((row) => row.map((cell) => `"${cell.replaceAll('"', '""')}"`).join(',') + '\n')
				.join('');
			expect(readCsv(text)).toEqual(rows);
		})
	);
});
