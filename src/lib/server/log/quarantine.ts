import type { Entry } from '$lib/logbook/entry';
import type { RefusalCode } from '$lib/logbook/refusals';
import type { PushResult, QuarantinedLine } from '$lib/logbook/wire';
import { write } from '../write';
import { Journal } from './journal';
import type { LogServer } from './log-server';
import { ownerRefusal } from './membership';
import { readOffered, referents } from './offered';
import type { Line } from './offered';
import {
	enrolmentRefusal,
	isAcceptable,
	refusedReferent,
	sealRefusal,
	settle,
	verdictForOwner
} from './verdict';

/** The list is for a person to read; what is left shows when these are decided. */
const MOST_LISTED = 500;

export interface QuarantineList {
	lines: (QuarantinedLine & { readonly hash: string })[];
}
export interface DecisionResults {
	/** One for each id asked about, in that order. */
	results: PushResult[];
}

/** A held line mostly finds what it refers to within seconds. Past this, in ms, the owner hears of it. */
export const HELD_PATIENCE = 10 * 60_000;

/**
 * The lines that wait for the owner's decision, oldest first: those refused, and those that have long been held for a
 * line that does not come, perhaps because the only phone that had it is lost.
 *
 * @param now ms since 1970
 */
export async function listQuarantine(
	{ db }: LogServer,
	actor: string,
	build: string,
	now = Date.now()
): Promise<QuarantineList | RefusalCode> {
	const member = await db
		.selectFrom('member')
		.select(['role', 'left'])
		.where('build', '=', build)
		.where('person', '=', actor)
		.executeTakeFirst();
	if (member === undefined) return 'build.unknown';
	if (member.left === 1) return 'build.removed';
	if (member.role !== 'owner') return 'build.owner_only';
	const rows = await db
		.selectFrom('quarantine')
		.select(['id', 'hash', 'code', 'text', 'seal', 'carrier', 'received'])
		.where('build', '=', build)
		.where('decision', 'is', null)
		.orderBy('received')
		.orderBy('id')
		.limit(MOST_LISTED)
		.execute();
	const held = await db
		.selectFrom('held')
		.select(['id', 'hash', 'text', 'carrier', 'received'])
		.where('build', '=', build)
		.where('received', '<=', now - HELD_PATIENCE)
		.orderBy('received')
		.orderBy('id')
		.limit(MOST_LISTED)
		.execute();
	return {
		lines: [
			...rows.map(({ id, hash, code, text, seal, carrier, received }) => ({
				id,
				hash,
				code,
				text,
				carrier,
				at: received,
				acceptable: isAcceptable({ code, text, seal, carrier })
			})),
			...held.map(({ id, hash, text, carrier, received }) => ({
				id,
				hash,
				code: 'entry.waits' satisfies RefusalCode,
				text,
				carrier,
				at: received,
				acceptable: standsAlone(readOffered(text).entry)
			}))
		]
	};
}

/**
 * May this line enter the log without what it refers to? A fold bears a cause that is not there. A strike or a
 * withdrawal does not stand alone: who may strike what is judged by the line struck.
 */
function standsAlone(entry: Entry | undefined): boolean {
	return entry !== undefined && entry.kind !== 'entry.struck' && entry.kind !== 'entry.withdrawn';
}

/**
 * Takes refused lines into the log, or puts them aside for good. Each is decided by itself.
 *
 * @param hashes which bytes are meant, where several stand under one id; without it, all of them
 */
export async function decideQuarantine(
	server: LogServer,
	actor: string,
	build: string,
	{
		ids,
		hashes,
		decision
	}: { ids: readonly string[]; hashes?: readonly string[]; decision: 'accept' | 'discard' }
): Promise<DecisionResults | RefusalCode> {
	const isMeant: Meant = ({ hash }) => hashes?.includes(hash) ?? true;
	const outcome = await write(server.db, async (trx) => {
		const journal = await Journal.open(trx, build);
		const refused = ownerRefusal(journal, actor);
		if (refused !== undefined || journal === undefined) return refused ?? 'build.unknown';
		await journal.lookUp(ids);
		const results =
			decision === 'accept'
				? await accept(journal, ids, isMeant)
				: discard(journal, ids, isMeant, actor);
		await journal.flush();
		return { results, seq: journal.place.seq };
	});
	if (typeof outcome === 'string') return outcome;
	server.live.headMoved(build, outcome.seq);
	return { results: ids.map((id) => ({ id, ...(outcome.results.get(id) ?? UNKNOWN) })) };
}

type Outcome = Omit<PushResult, 'id'>;
/** Is this one of the lines that are decided on? */
type Meant = (line: { readonly hash: string }) => boolean;
const UNKNOWN: Outcome = { status: 'refused', code: 'quarantine.not_acceptable' };

function discard(
	journal: Journal,
	ids: readonly string[],
	isMeant: Meant,
	actor: string
): Map<string, Outcome> {
	const results = new Map<string, Outcome>();
	for (const id of ids) {
		// Held lines were not shown if others were. Kept like any other the owner decided against, so that its device
		// hears of it.
		if (journal.quarantinedUnder(id).length === 0)
			for (const held of journal.heldUnder(id))
				if (isMeant(held)) journal.quarantine({ ...held, code: 'entry.waits' });
		const lines = journal.quarantinedUnder(id).filter(isMeant);
		if (lines.length === 0) {
			if (journal.find(id)) results.set(id, { status: 'duplicate' });
			continue;
		}
		for (const { hash } of lines) journal.discard(id, hash, actor);
		results.set(id, { status: 'discarded' });
	}
	return results;
}

async function accept(
	journal: Journal,
	ids: readonly string[],
	isMeant: Meant
): Promise<Map<string, Outcome>> {
	const results = new Map<string, Outcome>();
	const lines: (Line & { id: string; seal: string; carrier: string })[] = [];
	const held = new Set<string>();
	for (const id of ids) {
		if (journal.find(id)) results.set(id, { status: 'duplicate' });
		const refused = journal.quarantinedUnder(id).sort((a, b) => a.received - b.received);
		const waiting = journal.heldUnder(id).map((line) => ({ ...line, code: 'entry.waits' }));
		for (const line of waiting) held.add(line.hash);
		// What was shown comes before what was not: of several under one id the first sound one takes it.
		for (const kept of [
			...refused.filter((line) => line.decision === null),
			...waiting,
			...refused.filter((line) => line.decision !== null)
		]) {
			if (!isMeant(kept) || kept.text === null || kept.seal === null || !isAcceptable(kept))
				continue;
			const line = readOffered(kept.text);
			if (line.entry && line.hash === kept.hash) {
				lines.push({ ...line, seal: kept.seal, carrier: kept.carrier });
				break;
			}
		}
	}
	// A line stands on lower n only, so that those accepted together find each other.
	lines.sort((a, b) => a.entry.n - b.entry.n);
	await journal.lookUp(lines.flatMap(({ entry }) => referents(entry)));
	await journal.lookUpDevices(lines.map(({ entry }) => entry.device));
	const moved = new Set<string>();
	for (const { carrier, ...line } of lines) {
		const { id, entry } = line;
		if (journal.find(id)) continue;
		const code =
			(await sealRefusal(line, journal)) ?? (await enrolmentRefusal(entry, carrier, journal));
		const judgement = code
			? ({ verdict: 'refuse', code } as const)
			: verdictForOwner(entry, journal);
		switch (judgement.verdict) {
			case 'accept':
				journal.append(line);
				moved.add(id);
				results.set(id, { status: 'accepted' });
				break;
			case 'hold':
				// Held already, and the owner takes it as it is.
				if (held.has(line.hash) && standsAlone(entry)) {
					journal.append(line);
					moved.add(id);
					results.set(id, { status: 'accepted' });
					break;
				}
				if (journal.isHeldOtherwise(id, line.hash)) {
					results.set(id, { status: 'refused', code: 'entry.id_conflict' });
					break;
				}
				journal.hold(line, carrier, judgement.waitsFor);
				results.set(id, { status: 'held' });
				break;
			case 'refuse':
				results.set(id, { status: 'refused', code: judgement.code });
				if (refusedReferent(entry, journal) !== null)
					results.set(id, { status: 'pending', code: 'entry.referent_refused' });
		}
	}
	await settle(journal, moved);
	return results;
}
