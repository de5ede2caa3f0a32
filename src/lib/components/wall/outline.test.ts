import { describe, expect, it } from 'vitest';
import { PART_OPTIONS } from '../plan/words';
import { drawingOf, HEIGHT, isRightHand, OUTLINE_NAMES, WIDTH, type Point } from './outline';

function isInside([x, y]: Point, edge: readonly Point[]): boolean {
	let inside = false;
	for (const [i, [ax, ay]] of edge.entries()) {
		const [bx, by] = edge[(i + 1) % edge.length] as Point;
		if (ay > y !== by > y && x < ((bx - ax) * (y - ay)) / (by - ay) + ax) inside = !inside;
	}
	return inside;
}

describe.each(OUTLINE_NAMES)('the outline of %s', (name) => {
	it.each([0, 1, 7, 40, 72])('holds all of %i marks, inside its edge and apart', (count) => {
		for (const mirrored of [false, true]) {
			const { edge, marks } = drawingOf(name, count, mirrored);
			expect(marks).toHaveLength(count);
			for (const [x, y] of edge) {
				expect(x >= 0 && x <= WIDTH && y >= 0 && y <= HEIGHT).toBe(true);
			}
			for (const mark of marks) expect(isInside(mark, edge), `${name} ${mark.join()}`).toBe(true);
			for (const [i, [x, y]] of marks.entries())
				for (const [ox, oy] of marks.slice(i + 1))
					expect(Math.hypot(x - ox, y - oy), `${name} ${x},${y} ${ox},${oy}`).toBeGreaterThan(3);
		}
	});

	it('is one that a plan offers', () => {
		expect(PART_OPTIONS.map(([part]) => part)).toContain(name);
	});
});

it('draws a name it does not know as another part, and none as well', () => {
	expect(drawingOf('keel', 9)).toEqual(drawingOf('other', 9));
	expect(drawingOf(undefined, 9)).toEqual(drawingOf('other', 9));
});

it('fills a right-hand part from the other side', () => {
	const [left, right] = [drawingOf('wing', 20), drawingOf('wing', 20, true)];
	expect(right.marks).toEqual(left.marks.map(([x, y]) => [WIDTH - x, y]));
	expect(['Right elevator', 'rh flap', 'Left wing', 'Bright work'].map(isRightHand)).toEqual([
		true,
		true,
		false,
		false
	]);
});
