import type { Entry } from '$lib/logbook/entry';
import { judge } from '$lib/logbook/judge';
import type { Judgement, Log } from '$lib/logbook/judge';
import type { Kind } from '$lib/logbook/kinds';
import { mayWrite } from '$lib/logbook/permission';
import { isRefusalCode, refusal } from '$lib/logbook/refusals';
import type { RefusalCode } from '$lib/logbook/refusals';
import { readOffered, referents } from './offered';
import type { Journal, QuarantinedLine, SealedLine } from './journal';

/** Only what people wrote about people or showed of them can be withdrawn; everything else is struck. */
const WITHDRAWABLE: ReadonlySet<string> = new Set<Kind>([
	'note.written',
	'photo.taken',
	'voice.recorded',
	'person.named'
]);

/** Beyond this the owner takes nothing in: the form ends at 2^52, and what stands on a line comes above it. */
const MOST_N = 2 ** 50;

/** A log that also knows enrolments that were refused. */
type WaitingLog = Log & Pick<Journal, 'refusedDevice'>;

/** What becomes of a line whose seal was found sound. */
export function verdict(entry: Entry, log: WaitingLog): Judgement {
	const judgement = judge(entry, log);
	// It shares the fate of its device's enrolment, instead of waiting for it out of everybody's sight.
	if (judgement.verdict === 'refuse' && judgement.code === 'device.unknown')
		return log.refusedDevice(entry.device)
			? { verdict: 'refuse', code: 'entry.referent_refused' }
			: judgement;
	if (judgement.verdict === 'accept' && entry.kind === 'entry.withdrawn') {
		const target = log.find(entry.body.entry);
		if (target && !WITHDRAWABLE.has(target.kind))
			return { verdict: 'refuse', code: 'withdraw.not_possible' };
	}
	return judgement;
}

/** The refused line a line came to stand on: one it refers to, or the enrolment of its device. */
export function refusedReferent(entry: Entry, log: WaitingLog): string | null {
	const enrolled = log.enrolledFor(entry.device) !== undefined;
	if (!enrolled && entry.kind !== 'device.enrolled') {
		const refused = log.refusedDevice(entry.device);
		if (refused) return refused.line;
	}
	return referents(entry).find((id) => !log.find(id) && log.isQuarantined(id)) ?? null;
}

/**
 * Judges what the owner takes into the log: who may write what is for the owner to overrule, what a line stands on is
 * not. A verdict on somebody's work stays an inspector's, whoever accepts it.
 */
export function verdictForOwner(entry: Entry, journal: Journal): Judgement {
	// Nothing could be written that stands on it, not even its strike.
	if (entry.n > MOST_N) return { verdict: 'refuse', code: 'entry.n_too_far' };
	const inspectorsOnly = !mayWrite('owner', entry.kind, entry.v);
	const author = journal.member(entry.author);
	return verdict(entry, {
		role: () => (inspectorsOnly ? author?.role : 'owner'),
		maxN: Number.MAX_SAFE_INTEGER,
		find: (id) => journal.find(id),
		isQuarantined: (id) => journal.isQuarantined(id),
		enrolledFor: (device) => journal.enrolledFor(device),
		refusedDevice: (device) => journal.refusedDevice(device)
	});
}

/**
 * Why a device may not be enrolled by this line, brought in this person's session. A key enters the log in the session
 * of the person it is to speak for and in no other, the owner's neither: else an owner could sign in the name of an
 * inspector with a key of their own making. And it is the only one of its device, here and in every other build: else
 * a false enrolment in one build would keep the true device out of all others.
 */
export async function enrolmentRefusal(
	entry: Entry,
	carrier: string,
	journal: Journal
): Promise<RefusalCode | undefined> {
	if (entry.kind !== 'device.enrolled') return undefined;
	const device = { person: entry.author, key: entry.body.key };
	const enrolled = journal.device(entry.device);
	if (enrolled) return enrolled.key === device.key ? undefined : 'device.enrolled_before';
	if (entry.author !== carrier)
		return journal.member(entry.author) ? 'device.carried' : 'entry.author_unknown';
	return (await journal.isEnrolledOtherwise(entry.device, device))
		? 'device.enrolled_before'
		: undefined;
}

/** Why the seal kept with a line does not do, now that the key of its device is known. */
export async function sealRefusal(
	{ entry, hash, seal }: SealedLine,
	journal: Journal
): Promise<RefusalCode | undefined> {
	const enrolled = journal.device(entry.device)?.key;
	const key = enrolled ?? (entry.kind === 'device.enrolled' ? entry.body.key : undefined);
	// Without a key nothing of the device is accepted; then the seal says nothing yet.
	if (key === undefined || (await journal.isSealedBy(key, entry.device, hash, seal)))
		return undefined;
	return 'seal.broken';
}

/** May the owner take this line into the log, as far as can be said without the log? */
export function isAcceptable({
	code,
	text,
	seal,
	carrier
}: Pick<QuarantinedLine, 'code' | 'text' | 'seal' | 'carrier'>): boolean {
	if (!isForOwner(code) || text === null || seal === null) return false;
	if (!text.includes('"kind":"device.enrolled"')) return true;
	const { entry } = readOffered(text);
	return entry?.kind !== 'device.enrolled' || entry.author === carrier;
}

/** May the owner take lines refused with this code into the log? */
export function isForOwner(code: string): boolean {
	return isRefusalCode(code) && refusal(code).entry === 'owner';
}

/** May a line refused with this code be offered again, unchanged, and be accepted? Then nothing is kept of it. */
export function isForLater(code: RefusalCode): boolean {
	return refusal(code).entry === 'later';
}

/**
 * Judges again what waited for lines that have moved, and what waited for those, until nothing moves: held lines whose
 * referent was accepted or refused, and lines that followed a refused one into quarantine.
 */
export async function settle(journal: Journal, moved: Iterable<string>): Promise<void> {
	let causes = new Set(moved);
	while (causes.size > 0) {
		const waiting = await journal.dependants(causes);
		causes = new Set();
		const lines = waiting.flatMap((kept) => {
			const line = kept.text === null ? undefined : readOffered(kept.text);
			return line?.entry && kept.seal !== null ? [{ ...line, kept, seal: kept.seal }] : [];
		});
		await journal.lookUp(lines.flatMap(({ entry }) => referents(entry)));
		await journal.lookUpDevices(lines.map(({ entry }) => entry.device));
		lines.sort((a, b) => a.entry.n - b.entry.n);
		for (const { kept, ...line } of lines) {
			const { entry, id } = line;
			// One that was released by another of this round.
			if (journal.find(id)) continue;
			const code =
				(await sealRefusal(line, journal)) ??
				(await enrolmentRefusal(entry, kept.carrier, journal));
			const judgement = code ? ({ verdict: 'refuse', code } as const) : verdict(entry, journal);
			switch (judgement.verdict) {
				case 'accept':
					journal.append(line);
					causes.add(id);
					break;
				case 'hold':
					// A held line is acknowledged: other bytes that come to wait as well do not take its place.
					if (journal.isHeldOtherwise(id, line.hash))
						journal.quarantine({ ...kept, code: 'entry.id_conflict' satisfies RefusalCode });
					else journal.hold(line, kept.carrier, judgement.waitsFor);
					break;
				case 'refuse': {
					const { code } = judgement;
					const followed = 'code' in kept && kept.code === code;
					const stands_on = refusedReferent(entry, journal);
					journal.quarantine({ ...kept, code, stands_on });
					if (!followed) causes.add(id);
				}
			}
		}
	}
}
