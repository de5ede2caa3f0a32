/** Readings, what is wrong with rivets, and what becomes of it. */
import type { Body, Fault } from '$lib/logbook/kinds';
import { NM_PER_THOU } from '$lib/rivet/length';
import type { Device } from './crew';
import type { Hole } from './pen';
import { thirtySeconds, type Crew, type Seam, type Shop } from './shop';
import { ANSWERED, FAULTS_SEEN, LIMITS, REFERRED } from './words';

type Found = Body<'reading.taken'>['found'];
const thou = (value: number) => ({ nm: value * NM_PER_THOU, unit: 'in' as const });

/** The limits of a new build for this rivet. Common practice, and said to be. */
export function limitsFor(callout: string): Body<'reading.taken'>['limits'] {
	const [least, most, height] = LIMITS[thirtySeconds(callout)] ?? [175, 219, 50];
	return {
		source: 'Common practice: 1.4 to 1.75 D wide, at least 0.4 D high',
		widthLeast: thou(least),
		widthMost: thou(most),
		heightLeast: thou(height)
	};
}

/** A head found inside the limits, or with a fault of its size. */
export function found({ pen: { random } }: Shop, callout: string, fault?: Fault): Found {
	const size = fault === 'under_driven' ? 'small' : fault === 'over_driven' ? 'big' : 'inside';
	if (random.chance(0.7)) return { by: 'gauge', size };
	const [least, most, height] = LIMITS[thirtySeconds(callout)] ?? [175, 219, 50];
	const width =
		size === 'inside'
			? random.between(least + 2, most - 2)
			: size === 'small'
				? least - random.between(1, 8)
				: most + random.between(1, 12);
	return {
		by: 'caliper',
		width: thou(width),
		height: thou(random.between(height + 2, height + 14)),
		uncertainty: thou(3)
	};
}

/** Measures one head. @param fault what the reading shows, when it is not inside */
export function read(
	shop: Shop,
	by: Device,
	seam: Seam,
	hole: Hole,
	reader: string,
	fault?: Fault
): void {
	const { pen } = shop;
	const { callout } = seam.plan.body;
	pen.wait(20, 60);
	pen.write(
		by,
		'reading.taken',
		{
			what: {
				is: 'hole',
				index: hole.index,
				...(hole.by !== undefined && { by: hole.by })
			},
			found: found(shop, callout, fault),
			limits: limitsFor(callout),
			reader,
			...(fault === undefined && pen.random.chance(0.6) && { drawn: true })
		},
		{ seam: seam.id, on: hole.heads }
	);
}

interface Defect {
	readonly id: string;
	readonly fault: Fault;
	readonly seam: Seam;
	readonly holes: readonly Hole[];
	/** Lines that answer it and that nothing stands on yet. */
	readonly heads: string[];
}

/** Somebody sees something wrong; it is put right at once, on a later evening, or stays open. */
export function noteDefect(
	shop: Shop,
	crew: Crew,
	seam: Seam,
	holes: readonly Hole[],
	seen?: Fault
): void {
	const { pen } = shop;
	const { random } = pen;
	const [fault, note] = seen === undefined ? random.pick(FAULTS_SEEN) : [seen];
	pen.wait(15, 90);
	const id = pen.remark(crew.device, 'defect.noted', seam.id, holes, {
		fault,
		...(crew.bucker !== undefined && { by: crew.bucker }),
		...(note !== undefined && { note })
	});
	const defect: Defect = { id, fault, seam, holes, heads: [] };
	seam.defects.add(id);
	// Late, one is sent to who made the parts, and the others stay open.
	if (shop.isLate ? fault === 'cracked' : random.chance(0.55)) putRight(shop, crew, defect);
	else putOff(shop, crew, defect);
}

function putOff(shop: Shop, crew: Crew, defect: Defect): void {
	shop.laterAt(defect.seam, shop.pen.random.between(1, 8), () => {
		putRight(shop, crew, defect);
	});
}

function putRight(shop: Shop, crew: Crew, defect: Defect): void {
	const { random } = shop.pen;
	// Somebody else wrote about these holes meanwhile: that comes first.
	if (defect.holes.some(({ heads }) => heads.length !== 1)) {
		putOff(shop, crew, defect);
		return;
	}
	switch (defect.fault) {
		case 'under_driven':
		case 'proud':
			driveFurther(shop, crew, defect);
			return;
		case 'smile':
		case 'off_centre':
			if (random.chance(0.6)) leave(shop, defect);
			else replace(shop, crew, defect);
			return;
		case 'cracked':
			if (shop.seldom('referred', 0.4)) refer(shop, crew, defect);
			else replace(shop, crew, defect);
			return;
		case 'enlarged_hole':
			decide(shop, defect, 'replace_oversize');
			replace(shop, crew, defect);
			return;
		default:
			replace(shop, crew, defect);
	}
}

function decide(
	shop: Shop,
	{ id, seam, holes, heads }: Defect,
	decision: Body<'defect.decided'>['decision'],
	note?: string
): void {
	const { pen } = shop;
	const by = pen.random.pick([shop.owner, ...shop.devicesIn('inspector')]);
	const body = { defect: id, decision, ...(note !== undefined && { note }) };
	pen.wait(60, 240);
	heads.push(pen.remark(by, 'defect.decided', seam.id, holes, body, heads.splice(0)));
}

function fixed(
	shop: Shop,
	crew: Crew,
	{ id, seam, holes, heads }: Defect,
	body: Omit<Body<'defect.fixed'>, 'defect' | 'holes'>
): void {
	shop.pen.wait(15, 60);
	shop.pen.remark(crew.device, 'defect.fixed', seam.id, holes, { defect: id, ...body }, heads);
	seam.defects.delete(id);
}

function leave(shop: Shop, defect: Defect): void {
	decide(shop, defect, 'leave', 'Shallow, no edge to it. Stays as it is.');
	defect.seam.defects.delete(defect.id);
}

/** It stays a defect until the answer comes. */
function refer(shop: Shop, crew: Crew, defect: Defect): void {
	decide(shop, defect, 'refer', REFERRED);
	shop.laterAt(defect.seam, shop.pen.random.between(4, 9), () => {
		if (defect.holes.some(({ heads }) => heads.length !== 1)) return;
		decide(shop, defect, 'replace', ANSWERED);
		replace(shop, crew, defect);
	});
}

function driveFurther(shop: Shop, crew: Crew, defect: Defect): void {
	shop.pen.wait(60, 180);
	fixed(shop, crew, defect, { action: 'driven_further' });
	const [hole] = defect.holes;
	if (hole) read(shop, crew.device, defect.seam, hole, crew.bucker ?? crew.shooter);
}

/** Drilled out and driven anew; where the hole was enlarged, the next size up, as somebody decided. */
function replace(shop: Shop, crew: Crew, defect: Defect): void {
	const { pen } = shop;
	const { id, seam, holes, fault } = defect;
	const oversize = fault === 'enlarged_hole';
	const size = thirtySeconds(seam.plan.body.callout);
	const callout = oversize ? nextSizeUp(seam.plan.body.callout, size) : seam.plan.body.callout;
	pen.wait(120, 400);
	pen.hold(crew.device, 'holes.drilled_out', seam.id, holes, { defect: id });
	pen.wait(60, 200);
	const rivet = pen.hold(crew.device, 'holes.driven', seam.id, holes, {
		method: 'driven',
		callout,
		shooter: crew.shooter,
		...(crew.bucker !== undefined && { bucker: crew.bucker })
	});
	fixed(shop, crew, defect, { action: oversize ? 'replaced_oversize' : 'replaced', rivet });
}

/**
 * A flush 3/32 goes up to NAS1097AD4, since the head of a 1/8 MS20426 does not fit the dimple (figures of the trade,
 * section 18); the others keep their part and take the next diameter.
 */
function nextSizeUp(callout: string, size: number): string {
	const up = callout.replace(`AD${size}`, `AD${size + 1}`);
	return size === 3 ? up.replace('MS20426', 'NAS1097') : up;
}
