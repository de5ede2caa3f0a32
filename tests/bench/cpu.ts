/**
 * Processor time of the servers a bench starts. On a busy machine the clock mostly measures the others; this does not.
 * Linux only; elsewhere there is nothing to tell.
 */
import { readdirSync, readFileSync } from 'node:fs';

/** The processes this one has started. */
export function children(): Set<number> {
	try {
		const tasks = readdirSync('/proc/self/task');
		return new Set(
			tasks.flatMap((task) =>
				readFileSync(`/proc/self/task/${task}/children`, 'utf8')
					.split(' ')
					.filter(Boolean)
					.map(Number)
			)
		);
	} catch {
		return new Set();
	}
}

/** Starts something, and tells which process came with it. */
export async function withPid<T>(start: () => Promise<T>): Promise<{ of: T; pid?: number }> {
	const before = children();
	const of = await start();
	const pid = [...children()].find((child) => !before.has(child));
	return pid === undefined ? { of } : { of, pid };
}

/** Ms of processor time this process and its threads have used, in steps of ten. */
export function cpuOf(pid: number | undefined): number {
	if (pid === undefined) return Number.NaN;
	try {
		// The name in parentheses may hold spaces; user and system time are fields 14 and 15.
		const fields = readFileSync(`/proc/${pid}/stat`, 'utf8').split(') ')[1]?.split(' ') ?? [];
		return (Number(fields[11]) + Number(fields[12])) * 10;
	} catch {
		return Number.NaN;
	}
}
