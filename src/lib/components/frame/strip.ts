/** How many marks of a strip are drawn, filled and taped. */
export interface StripMarks {
	readonly marks: number;
	/** Whole marks; a share of a hole is never drawn as driven. */
	readonly filled: number;
	readonly taped: number;
}

/**
 * Scales holes to at most `most` marks. What must hold: all marks are filled only when every hole is driven, at least
 * one is once any is, and driven and left open never overlap.
 */
export function stripOf({
	driven,
	holes,
	leftOpen,
	most
}: {
	readonly driven: number;
	readonly holes: number;
	readonly leftOpen: number;
	readonly most: number;
}): StripMarks {
	const marks = Math.min(holes, most);
	if (marks === 0) return { marks: 0, filled: 0, taped: 0 };
	const scaled = (count: number) =>
		count === 0 ? 0 : Math.max(1, Math.floor((count * marks) / holes));
	const filled = driven >= holes ? marks : Math.min(scaled(driven), Math.max(marks - 1, 0));
	return { marks, filled, taped: Math.min(scaled(leftOpen), marks - filled) };
}
