/** How things stand with the server, in a few words. Pure. */
import type { BuildStatus, Status } from '$lib/device/loop';
import { counted } from '../frame/numbers';

export interface SyncText {
	readonly look: 'solid' | 'outline' | 'hatched';
	readonly words: string;
	/** Refused lines are counted beside it, never in it. */
	readonly refused?: string;
}

/** Of a build that is never synced. */
export const STAYS: SyncText = { look: 'outline', words: 'stays here' };

type Counts = Pick<
	Status,
	| 'phase'
	| 'waiting'
	| 'held'
	| 'pending'
	| 'refused'
	| 'discarded'
	| 'parked'
	| 'acknowledgedNotBack'
	| 'offeredAgain'
	| 'synced'
	| 'lastSuccess'
>;

/** The words of the header. Offline is normal and says only what it means: the lines are here. */
export function syncText(status: Counts): SyncText {
	const refused = status.refused + status.pending + status.discarded;
	const beside = refused > 0 ? { refused: `${refused} not accepted` } : {};
	const waiting = status.waiting + status.parked;
	if (status.phase === 'syncing' && waiting > 0)
		return { look: 'hatched', words: 'sending', ...beside };
	if (waiting > 0)
		return {
			look: 'hatched',
			words:
				status.phase === 'signed_out' ? `waiting ${waiting}, signed out` : `waiting ${waiting}`,
			...beside
		};
	if (status.phase === 'signed_out') return { look: 'outline', words: 'signed out', ...beside };
	if (status.phase === 'other_person')
		return { look: 'outline', words: 'somebody else is signed in', ...beside };
	if (status.held > 0) return { look: 'hatched', words: `held ${status.held}`, ...beside };
	if (status.synced && status.lastSuccess !== undefined)
		return { look: 'solid', words: `synced ${hour(status.lastSuccess)}`, ...beside };
	if (status.phase === 'syncing' || status.acknowledgedNotBack + status.offeredAgain > 0)
		return { look: 'outline', words: 'checking', ...beside };
	return { look: 'outline', words: 'on this phone', ...beside };
}

/** Where the lines of one build are, for the bench: "3 waiting" are on this phone and nowhere else yet. */
export function savedIn(
	build: Pick<BuildStatus, 'waiting' | 'parked' | 'held' | 'synced' | 'lastSuccess'> | undefined
): SyncText {
	const waiting = build ? build.waiting + build.parked : 0;
	if (waiting > 0) return { look: 'hatched', words: `${waiting} waiting` };
	if (build && build.held > 0) return { look: 'hatched', words: `${build.held} held` };
	if (build?.synced && build.lastSuccess !== undefined)
		return { look: 'solid', words: `synced ${hour(build.lastSuccess)}` };
	return { look: 'outline', words: 'on this phone' };
}

/** What a build's lines wait for, each as a sentence. Empty when nothing waits. */
export function waitsFor(build: BuildStatus): string[] {
	const lines = (value: number) => counted(value, 'line');
	return [
		build.waiting > 0 &&
			`${lines(build.waiting)} ${build.waiting === 1 ? 'is' : 'are'} only on this phone.`,
		build.parked > 0 &&
			`${lines(build.parked)} set aside: the server failed on ${build.parked === 1 ? 'it' : 'them'} alone. Tried again later.`,
		build.held > 0 &&
			`${lines(build.held)} held by the server until a line ${build.held === 1 ? 'it refers' : 'they refer'} to arrives.`,
		build.acknowledgedNotBack > 0 &&
			`${lines(build.acknowledgedNotBack)} on the server’s disk, not seen in its log yet.`,
		build.offeredAgain > 0 &&
			`${lines(build.offeredAgain)} offered again, because the server’s log changed.`,
		build.pending > 0 && `${lines(build.pending)} with the owner, who decides.`
	].filter((text) => text !== false);
}

function hour(ms: number): string {
	const date = new Date(ms);
	return `${String(date.getHours()).padStart(2, '0')}:${String(date.getMinutes()).padStart(2, '0')}`;
}

const DAY = 86_400_000;
/** "21:42", or with the day when it was not today. */
export function moment(ms: number, now: number): string {
	const date = new Date(ms);
	return new Date(now).toDateString() === date.toDateString() && Math.abs(now - ms) < DAY
		? hour(ms)
		: `${date.getDate()} ${date.toLocaleString('en', { month: 'long' })} ${hour(ms)}`;
}
