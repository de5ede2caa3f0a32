/**
 * The parts of an aeroplane as a builder would scribe them on a sheet: shapes of our own, of no aeroplane in
 * particular, and where on them the hole marks lie. Pure.
 */

export type Point = readonly [x: number, y: number];

interface Shape {
	/** Corners, one after the other, on a field of 240 by 100. */
	readonly edge: readonly Point[];
	/** Lines of rivets inside: ribs, frames, spars. */
	readonly inside: readonly (readonly [Point, Point])[];
}

export const WIDTH = 240;
export const HEIGHT = 100;
/** From the edge of the sheet to the row of rivets along it. */
const EDGE_DISTANCE = 8;

const upright = (xs: readonly number[], from: number, to: number) =>
	xs.map((x): readonly [Point, Point] => [
		[x, from],
		[x, to]
	]);
const level = (ys: readonly number[], from: number, to: number) =>
	ys.map((y): readonly [Point, Point] => [
		[from, y],
		[to, y]
	]);

/** A box with one corner clipped, like a trimmed gusset. */
const box = (x: number, y: number, right: number, bottom: number, clip: number): Point[] => [
	[x, y],
	[right - clip, y],
	[right, y + clip],
	[right, bottom],
	[x, bottom]
];

const OTHER: Shape = { edge: box(30, 18, 210, 82, 16), inside: level([50], 44, 196) };

/** By the names that `assembly.planned` holds; any other name is drawn as another part. */
const SHAPES: Readonly<Record<string, Shape>> = {
	wing: {
		edge: [
			[6, 40],
			[18, 27],
			[234, 8],
			[234, 92],
			[18, 80],
			[6, 70]
		],
		inside: [...upright([56, 98, 140, 182], 34, 74), ...upright([216], 24, 78)]
	},
	spar: {
		edge: [
			[4, 40],
			[236, 26],
			[236, 74],
			[4, 62]
		],
		inside: [...upright([84, 150], 48, 54), ...upright([208], 46, 56)]
	},
	aileron: {
		edge: [
			[8, 36],
			[232, 28],
			[232, 62],
			[14, 72]
		],
		inside: upright([62, 116, 170], 47, 53)
	},
	flap: {
		edge: box(8, 28, 232, 74, 12),
		inside: upright([54, 100, 146, 192], 44, 60)
	},
	stabilizer: {
		edge: [
			[34, 18],
			[206, 18],
			[236, 78],
			[126, 78],
			[120, 70],
			[114, 78],
			[4, 78]
		],
		inside: upright([56, 88, 152, 184], 36, 60)
	},
	elevator: {
		edge: [
			[6, 12],
			[34, 12],
			[34, 30],
			[234, 30],
			[222, 78],
			[16, 84]
		],
		inside: upright([62, 102, 142, 182], 46, 66)
	},
	fin: {
		edge: [
			[46, 94],
			[112, 6],
			[168, 6],
			[206, 94]
		],
		inside: level([36, 60], 116, 156)
	},
	rudder: {
		edge: [
			[62, 4],
			[112, 4],
			[112, 26],
			[176, 26],
			[196, 96],
			[88, 96],
			[88, 46],
			[62, 46]
		],
		inside: level([54, 72], 112, 162)
	},
	fuselage: {
		edge: [
			[6, 56],
			[30, 36],
			[84, 24],
			[104, 8],
			[160, 8],
			[234, 26],
			[234, 82],
			[40, 88]
		],
		inside: [...upright([64], 44, 72), ...upright([112, 160, 204], 38, 72)]
	},
	tail_cone: {
		edge: [
			[6, 14],
			[234, 42],
			[234, 62],
			[6, 90]
		],
		inside: [...upright([52, 98], 36, 68), ...upright([144, 190], 48, 56)]
	},
	floor: {
		edge: box(24, 10, 216, 90, 12),
		inside: [...upright([72, 120, 168], 28, 44), ...upright([72, 120, 168], 58, 74)]
	},
	tank: {
		edge: [
			[30, 16],
			[196, 10],
			[210, 22],
			[210, 90],
			[30, 84]
		],
		inside: upright([70, 106, 142, 178], 34, 70)
	},
	cowling: {
		edge: [
			[14, 42],
			[40, 18],
			[130, 8],
			[226, 12],
			[226, 88],
			[130, 92],
			[40, 82],
			[14, 60]
		],
		inside: upright([100, 160], 26, 74)
	}
};
export const OUTLINE_NAMES: readonly string[] = [...Object.keys(SHAPES), 'other'];

export interface Drawing {
	readonly edge: readonly Point[];
	/** Where the marks lie, in the order in which they fill: from one end to the other. */
	readonly marks: readonly Point[];
}

/**
 * @param outline name of a shape
 * @param count marks to be placed, whole, 0 or more
 * @param mirrored a right-hand part is the left-hand one seen in a mirror
 */
export function drawingOf(outline: string | undefined, count: number, mirrored = false): Drawing {
	const { edge, inside } = SHAPES[outline ?? ''] ?? OTHER;
	const row = inset(edge);
	const marks = spread([[...row, row[0] as Point], ...inside], count).sort(
		([ax, ay], [bx, by]) => ax - bx || ay - by
	);
	const flip = ([x, y]: Point): Point => [mirrored ? WIDTH - x : x, y];
	return { edge: edge.map(flip), marks: marks.map(flip) };
}

/** Is it the right-hand one of a pair? Builders call it so. */
export function isRightHand(name: string): boolean {
	return /^(right|rh|stbd|starboard)\b/i.test(name.trim());
}

/** Marks at equal steps along each path, the first of which is closed, as many on each as its share of the length. */
function spread(paths: readonly (readonly Point[])[], count: number): Point[] {
	const lengths = paths.map(lengthOf);
	const whole = lengths.reduce((sum, length) => sum + length, 0);
	let before = 0;
	let placed = 0;
	return paths.flatMap((path, i) => {
		const length = lengths[i] ?? 0;
		before += length;
		// What is due up to the end of this path, less what stands already: the shares add up to `count`.
		const here = Math.round((before / whole) * count) - placed;
		placed += here;
		const from = (phase: number) =>
			Array.from({ length: here }, (_, k) => along(path, ((k + phase) / here) * length));
		return i === 0 ? roomiest(PHASES.map(from)) : from(0.5);
	});
}

const PHASES = [0.5, 0.6, 0.7, 0.8, 0.9, 0, 0.1, 0.2, 0.3, 0.4];

/** The one whose nearest two marks lie furthest apart: around a sharp corner they come close. */
function roomiest(choices: readonly Point[][]): Point[] {
	const room = (marks: readonly Point[]) =>
		Math.min(...marks.map((mark, k) => distance(mark, marks[(k + 1) % marks.length] as Point)));
	return choices.reduce((best, other) => (room(other) > room(best) ? other : best));
}

function lengthOf(path: readonly Point[]): number {
	return path.slice(1).reduce((sum, to, i) => sum + distance(path[i] as Point, to), 0);
}

function distance([ax, ay]: Point, [bx, by]: Point): number {
	return Math.hypot(bx - ax, by - ay);
}

/** The point so far along a path of at least two. */
function along(path: readonly Point[], way: number): Point {
	let left = way;
	for (const [i, to] of path.slice(1).entries()) {
		const from = path[i] as Point;
		const step = distance(from, to);
		if (left <= step && step > 0) {
			const share = left / step;
			return [from[0] + (to[0] - from[0]) * share, from[1] + (to[1] - from[1]) * share];
		}
		left -= step;
	}
	return path.at(-1) as Point;
}

/** The corners moved inward by the edge distance. */
function inset(edge: readonly Point[]): Point[] {
	const moved = edge.map((from, i): readonly [Point, Point] => {
		const to = edge[(i + 1) % edge.length] as Point;
		// All shapes run clockwise as they are drawn: inward is to the right of the way.
		const step = EDGE_DISTANCE / distance(from, to);
		const [dx, dy] = [-(to[1] - from[1]) * step, (to[0] - from[0]) * step];
		return [
			[from[0] + dx, from[1] + dy],
			[to[0] + dx, to[1] + dy]
		];
	});
	return moved.map((line, i) => crossing(moved.at(i - 1) as readonly [Point, Point], line));
}

function crossing([a, b]: readonly [Point, Point], [c, d]: readonly [Point, Point]): Point {
	const [rx, ry] = [b[0] - a[0], b[1] - a[1]];
	const [sx, sy] = [d[0] - c[0], d[1] - c[1]];
	const across = rx * sy - ry * sx;
	if (Math.abs(across) < 1e-9) return c;
	const t = ((c[0] - a[0]) * sy - (c[1] - a[1]) * sx) / across;
	return [a[0] + rx * t, a[1] + ry * t];
}
