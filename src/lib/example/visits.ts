/** The inspector's visits, and closing an assembly. */
import { canonicalText, hashText, tidy } from '$lib/logbook/bytes';
import { start, type Place } from '$lib/logbook/chain';
import type { Entry } from '$lib/logbook/entry';
import { digestOf, materialOf } from '$lib/logbook/signoff';
import { read } from './faults';
import { isClean, type Assembly, type Seam, type Shop } from './shop';

/** Evenings from one visit to the next. */
export const BETWEEN_VISITS = 12;

/** Asks for a look at a finished seam. */
export function ask(shop: Shop, seam: Seam): void {
	if (shop.devicesIn('inspector').length === 0) return;
	shop.pen.wait(20, 60);
	const line = shop.pen.write(shop.owner, 'inspection.asked', {}, { seam: seam.id });
	shop.asked.push({ seam, line });
}

/** A morning in the shop: a few heads gauged on each seam asked for, then the signature, or the reason for none. */
export function visit(shop: Shop): void {
	const { pen } = shop;
	const [device] = shop.devicesIn('inspector');
	const inspector = shop.members.find(({ id }) => id === device?.person);
	if (!device || !inspector) return;
	const last = shop.evening + BETWEEN_VISITS > shop.lastEvening;
	for (const { seam, line } of shop.asked.splice(0)) {
		pen.wait(300, 900);
		const rivets = seam.holes.filter(({ heads }) => heads.length === 1);
		for (let i = 0; i < 3 && rivets.length > 0; i++)
			read(shop, device, seam, pen.random.pick(rivets as [never, ...never[]]), inspector.id);
		if (!isClean(seam)) {
			pen.write(
				device,
				'inspection.refused',
				{
					asked: line,
					reason: 'Something on this seam is still open. Ask again when it is settled.'
				},
				{ seam: seam.id, on: [line] }
			);
			shop.later(6, () => {
				if (isClean(seam) && !seam.assembly.closed) ask(shop, seam);
			});
			continue;
		}
		seam.signed = pen.write(
			device,
			'inspection.signed',
			{
				verdict: pen.random.chance(0.8) ? 'in_order' : 'in_order_with_remarks',
				asked: line,
				...coverage(shop, seam),
				link: placeOf(shop),
				name: inspector.name,
				statement:
					'I looked at every head of this seam and gauged those recorded. Not an airworthiness approval.'
			},
			{ seam: seam.id, on: [line, ...(seam.signed === undefined ? [] : [seam.signed])] }
		);
		if (last ? shop.seldom('stale at last', 0) : shop.seldom('stale', 0.1)) findLater(shop, seam);
	}
}

/**
 * One more reading of the seam turns up after it was signed: the sign-off no longer covers all there is, and is asked for
 * again.
 */
function findLater(shop: Shop, seam: Seam): void {
	shop.laterAt(seam, 2, () => {
		const [hole] = seam.holes;
		if (hole) read(shop, shop.owner, seam, hole, shop.owner.person);
		ask(shop, seam);
	});
}

/** Nothing was ever sent: the head this device had verified is the start of the build. */
function placeOf(shop: Shop): Place {
	return start(shop.pen.build);
}

function coverage(shop: Shop, seam: Seam): { covers: string[]; digest: string } {
	const lines = shop.pen.linesOf(seam.id);
	const byId = new Map(lines.map((entry) => [entry.id, entry]));
	const covers = materialOf(lines.map((entry) => ({ id: entry.id, envelope: entry, entry })));
	const covered = covers.map((id) => ({
		id,
		hash: hashText(canonicalText(tidy(byId.get(id) as Entry)))
	}));
	return { covers, digest: digestOf(covered) };
}

/** Closes an assembly whose seams are all in order: steps, closing list, closed. */
export function closeIfReady(shop: Shop, assembly: Assembly): void {
	// Nothing may come after the closing, the inspector's readings neither.
	if (shop.asked.some(({ seam }) => seam.assembly === assembly)) return;
	if (!assembly.seams.every(isClean)) return;
	const { pen, owner } = shop;
	for (const step of assembly.steps) {
		pen.wait(120, 600);
		pen.write(
			owner,
			'step.done',
			{
				step: step.id,
				...(step.number && {
					value: {
						number: pen.random.pick(['1.0', '1.2', '2.5']),
						unit: step.unit ?? 'psi'
					}
				})
			},
			{ assembly: assembly.id }
		);
	}
	if (assembly.steps.length > 0)
		pen.write(
			owner,
			'closing.listed',
			{
				items: [
					{ what: 'Swarf and tools out', is: 'yes' },
					{ what: 'Photos of the inside', is: 'yes' },
					{ what: 'Lines and wires through', is: pen.random.chance(0.5) ? 'yes' : 'not_needed' }
				]
			},
			{ assembly: assembly.id }
		);
	pen.wait(30, 90);
	pen.write(
		owner,
		'assembly.closed',
		{ signed: assembly.seams.flatMap(({ signed }) => signed ?? []) },
		{ assembly: assembly.id }
	);
	assembly.closed = true;
	shop.finished.delete(assembly);
}
