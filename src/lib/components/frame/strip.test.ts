import { describe, expect, it } from 'vitest';
import { stripOf } from './strip';

const strip = (driven: number, holes: number, leftOpen = 0) =>
	stripOf({ driven, holes, leftOpen, most: 32 });

describe('a strip', () => {
	it('has one mark a hole where they fit', () => {
		expect(strip(5, 20, 2)).toEqual({ marks: 20, filled: 5, taped: 2 });
	});

	it('is full only when every hole is driven', () => {
		expect(strip(9000, 9000)).toEqual({ marks: 32, filled: 32, taped: 0 });
		expect(strip(8999, 9000).filled).toBe(31);
	});

	it('is not empty once one hole is driven', () => {
		expect(strip(1, 9000).filled).toBe(1);
		expect(strip(0, 9000).filled).toBe(0);
	});

	it('never draws a hole both driven and left open', () => {
		const { marks, filled, taped } = strip(8990, 9000, 10);
		expect(filled + taped).toBeLessThanOrEqual(marks);
	});

	it('draws nothing for a seam without holes', () => {
		expect(strip(0, 0)).toEqual({ marks: 0, filled: 0, taped: 0 });
	});
});
