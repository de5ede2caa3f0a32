/**
 * The closed list of kinds. What an entry of each kind may say, what it concerns, who may write it, and
 * whether a sign-off hangs on it.
 *
 * Frozen: a body, once shipped, is accepted for ever, by servers and phones we no longer control. A new field is
 * a new version of the kind (`'holes.driven@2'`), read by upcasting; never an edit here.
 */
import * as z from 'zod/mini';
import {
	Callout,
	Day,
	Decimal,
	Hash,
	HoleRange,
	Holes,
	Id,
	Length,
	Method,
	MOST_HOLES,
	PlannedMethod,
	PublicKey,
	Quantity,
	Role,
	Stack,
	text,
	WallTime,
	whole
} from './scalars';

const optional = z.optional;
/** A person with an account, or the `person.named` line of a helper without one. */
const Person = Id;
/** A field of the plan that a later line may empty again. */
const clearable = <T extends z.core.SomeType>(schema: T) => optional(z.union([schema, z.null()]));
const order = whole(0, 1_000_000_000);
const people = z.array(Person).check(z.minLength(1), z.maxLength(20));

// ---- build, crew, devices -------------------------------------------------------------------------------

/** Rules of the build by name (acceptance limits, sampling, rounding…), as the owner wrote them. */
const Rules = z
	.record(z.string().check(z.regex(/^[a-z][a-z0-9_.]{0,47}$/)), text(200))
	.check(z.refine((rules) => Object.keys(rules).length <= 100));

const buildFields = { about: text(400), units: z.enum(['in', 'mm']), place: text(80) };
const BuildOpened = z.strictObject({
	name: text(80),
	about: optional(buildFields.about),
	units: optional(buildFields.units),
	place: optional(buildFields.place),
	rules: optional(Rules)
});
const BuildDescribed = z.strictObject({
	name: optional(text(80)),
	about: clearable(buildFields.about),
	units: optional(buildFields.units),
	place: clearable(buildFields.place),
	rules: optional(
		z.record(z.string().check(z.regex(/^[a-z][a-z0-9_.]{0,47}$/)), z.union([text(200), z.null()]))
	)
});

const CrewJoined = z.strictObject({ person: Person, role: Role });
const CrewRole = z.strictObject({ person: Person, role: Role });
const CrewLeft = z.strictObject({ person: Person, reason: optional(text(200)) });
/** A person who registered anew (the server moved) is the author `author` of old lines. */
const CrewBound = z.strictObject({ person: Person, author: Person });
const OwnerChanged = z.strictObject({ from: Person, to: Person });
const DeviceEnrolled = z.strictObject({ key: PublicKey, name: optional(text(60)) });
/** A helper without an account; their identity is this line's id. */
const PersonNamed = z.strictObject({ name: text(80), note: optional(text(200)) });

// ---- assemblies -----------------------------------------------------------------------------------------

/** A non-rivet step of the plan: text and the value to be typed, if any. The app computes nothing from it. */
const PlannedStep = z.strictObject({
	text: text(400),
	order: optional(order),
	value: optional(z.enum(['text', 'number'])),
	unit: optional(text(16)),
	drawing: optional(text(80))
});
const assemblyFields = {
	order,
	/** Name of the outline drawn on the wall. */
	outline: text(32),
	note: text(2000),
	drawing: text(80)
};
const AssemblyPlanned = z.strictObject({
	name: text(120),
	order: optional(assemblyFields.order),
	outline: optional(assemblyFields.outline),
	note: optional(assemblyFields.note),
	drawing: optional(assemblyFields.drawing),
	steps: optional(z.record(Id, PlannedStep))
});
const AssemblyChanged = z.strictObject({
	name: optional(text(120)),
	order: clearable(assemblyFields.order),
	outline: clearable(assemblyFields.outline),
	note: clearable(assemblyFields.note),
	drawing: clearable(assemblyFields.drawing),
	steps: optional(z.record(Id, z.union([PlannedStep, z.null()])))
});
const AssemblyClosed = z.strictObject({
	signed: optional(z.array(Id).check(z.maxLength(500))),
	note: optional(text(2000))
});
const AssemblyReopened = z.strictObject({ reason: text(400) });
const AssemblyRetired = z.strictObject({ reason: optional(text(400)) });

// ---- seams ----------------------------------------------------------------------------------------------

/** A range of holes that differs from the seam: tapered stacks, doublers, blind and solid in one row. */
const Override = z.strictObject({
	holes: Holes,
	callout: optional(Callout),
	stack: optional(Stack),
	method: optional(PlannedMethod),
	/** Planned to stay open, and what will close it. */
	leaveOpen: optional(text(200)),
	note: optional(text(200))
});
const seamFields = {
	callout: Callout,
	stack: Stack,
	pattern: z.enum(['row', 'rows', 'free', 'nutplates']),
	rows: whole(1, 50),
	/** Holes in each row, where rows differ. Their sum is the count. */
	perRow: z.array(whole(1, MOST_HOLES)).check(z.minLength(1), z.maxLength(50)),
	layout: z.enum(['parallel', 'staggered']),
	/** How numbers run through several rows. */
	numbering: z.enum(['row_by_row', 'back_and_forth', 'across']),
	/** Places of a free pattern: along, across, along, across… in nanometres. */
	points: z
		.array(whole(-100_000_000_000, 100_000_000_000))
		.check(z.minLength(2), z.maxLength(1600)),
	pitch: Length,
	rowSpacing: Length,
	edge: Length,
	/** Where hole 1 is, e.g. "inboard"; and the other end. */
	endOne: text(40),
	endLast: text(40),
	/** The manufactured head is on the near or the far side of the drawing (NAS 523). */
	head: z.enum(['near', 'far']),
	drawing: text(80),
	sheet: text(40),
	step: text(40),
	revision: text(40),
	order,
	/** Who it takes: one, or two with one on each side. */
	people: z.union([z.literal(1), z.literal(2)]),
	sealing: z.enum(['dry', 'wet']),
	/** Driving this seam closes the structure: look inside first. */
	closes: z.boolean(),
	method: PlannedMethod,
	note: text(2000)
};
const SeamPlanned = z.strictObject({
	name: text(120),
	assembly: Id,
	/** The holes it starts with and the number of the first. Later ones come with `holes.added`. */
	holes: z.strictObject({ count: whole(1, MOST_HOLES), first: whole(0, 1_000_000) }),
	callout: optional(seamFields.callout),
	stack: optional(seamFields.stack),
	pattern: optional(seamFields.pattern),
	rows: optional(seamFields.rows),
	perRow: optional(seamFields.perRow),
	layout: optional(seamFields.layout),
	numbering: optional(seamFields.numbering),
	points: optional(seamFields.points),
	pitch: optional(seamFields.pitch),
	rowSpacing: optional(seamFields.rowSpacing),
	edge: optional(seamFields.edge),
	endOne: optional(seamFields.endOne),
	endLast: optional(seamFields.endLast),
	head: optional(seamFields.head),
	drawing: optional(seamFields.drawing),
	sheet: optional(seamFields.sheet),
	step: optional(seamFields.step),
	revision: optional(seamFields.revision),
	order: optional(seamFields.order),
	people: optional(seamFields.people),
	sealing: optional(seamFields.sealing),
	closes: optional(seamFields.closes),
	method: optional(seamFields.method),
	note: optional(seamFields.note),
	overrides: optional(z.record(Id, Override))
});
/** Carries only the fields changed; null empties one. */
const SeamChanged = z.strictObject({
	name: optional(text(120)),
	assembly: optional(Id),
	callout: clearable(seamFields.callout),
	stack: clearable(seamFields.stack),
	pattern: clearable(seamFields.pattern),
	rows: clearable(seamFields.rows),
	perRow: clearable(seamFields.perRow),
	layout: clearable(seamFields.layout),
	numbering: clearable(seamFields.numbering),
	points: clearable(seamFields.points),
	pitch: clearable(seamFields.pitch),
	rowSpacing: clearable(seamFields.rowSpacing),
	edge: clearable(seamFields.edge),
	endOne: clearable(seamFields.endOne),
	endLast: clearable(seamFields.endLast),
	head: clearable(seamFields.head),
	drawing: clearable(seamFields.drawing),
	sheet: clearable(seamFields.sheet),
	step: clearable(seamFields.step),
	revision: clearable(seamFields.revision),
	order: clearable(seamFields.order),
	people: clearable(seamFields.people),
	sealing: clearable(seamFields.sealing),
	closes: clearable(seamFields.closes),
	method: clearable(seamFields.method),
	note: clearable(seamFields.note),
	overrides: optional(z.record(Id, z.union([Override, z.null()])))
});
const SeamRetired = z.strictObject({ reason: optional(text(400)) });
const HolesAdded = z.strictObject({
	count: whole(1, MOST_HOLES),
	/** Number of the first; the rest follow. */
	first: whole(0, 1_000_000),
	row: optional(whole(1, 50)),
	/** They lie after this hole; at the end when left out. */
	after: optional(z.strictObject({ by: optional(Id), index: whole(1, MOST_HOLES) })),
	reason: optional(text(200))
});
const HolesRetired = z.strictObject({ holes: Holes, reason: optional(text(200)) });

// ---- getting ready --------------------------------------------------------------------------------------

const SetupMade = z.strictObject({
	gun: optional(text(60)),
	pressure: optional(Quantity),
	set: optional(text(60)),
	bar: optional(text(60)),
	barWeight: optional(Quantity),
	method: optional(PlannedMethod),
	callout: optional(Callout),
	shooter: optional(Person),
	bucker: optional(Person),
	sealing: optional(z.enum(['dry', 'wet'])),
	note: optional(text(400))
});
const PrepDone = z.strictObject({
	step: z.enum([
		'drilled',
		'deburred',
		'dimpled',
		'countersunk',
		'cleaned',
		'primed',
		'clecoed',
		'other'
	]),
	holes: optional(Holes),
	primer: optional(text(60)),
	batch: optional(text(60)),
	by: optional(Person),
	note: optional(text(400))
});
const SealantMixed = z.strictObject({
	product: text(80),
	batch: optional(text(60)),
	expires: optional(Day),
	mixedAt: WallTime,
	/** Application life from mixing. */
	minutes: whole(1, 2880),
	note: optional(text(400))
});
const BagOpened = z.strictObject({
	callout: Callout,
	lot: optional(text(60)),
	source: optional(text(80)),
	/** The alloy's head mark was seen. */
	markSeen: optional(z.boolean()),
	note: optional(text(400))
});

/** Limits a reading was judged by, and where they come from. */
const Limits = z.strictObject({
	source: text(120),
	widthLeast: optional(Length),
	widthMost: optional(Length),
	heightLeast: optional(Length),
	heightMost: optional(Length)
});
const measured = {
	width: optional(Length),
	height: optional(Length),
	uncertainty: optional(Length)
};
const measuredOne = z.refine((found) => {
	const { width, height } = found as { width?: unknown; height?: unknown };
	return width !== undefined || height !== undefined;
});
/** What was found: by a go/no-go gauge, or measured with the tool's uncertainty. */
const Found = z.discriminatedUnion('by', [
	z.strictObject({ by: z.literal('gauge'), size: z.enum(['inside', 'small', 'big']) }),
	z.strictObject({ by: z.literal('caliper'), ...measured }).check(measuredOne),
	z
		.strictObject({
			by: z.literal('photo'),
			...measured,
			/** The thing of known size beside the head, so that the picture can be measured again. */
			scale: optional(z.strictObject({ what: text(60), size: Length }))
		})
		.check(measuredOne),
	/** Pulled rivets have no shop head to measure. */
	z.strictObject({ by: z.literal('eye'), seated: z.boolean() })
]);
const Heads = z
	.array(z.strictObject({ found: optional(Found), fault: optional(text(40)) }))
	.check(z.minLength(1), z.maxLength(60));
const StripShot = z.strictObject({
	callout: Callout,
	stack: optional(Stack),
	setup: optional(Id),
	shooter: optional(Person),
	bucker: optional(Person),
	limits: optional(Limits),
	heads: Heads,
	note: optional(text(400))
});
const PracticeLogged = z.strictObject({
	person: Person,
	callout: Callout,
	stack: optional(Stack),
	limits: optional(Limits),
	heads: Heads,
	/** How many were drilled out and looked at. */
	drilledOut: optional(whole(0, 60)),
	setup: optional(Id),
	/** Who held the other tool. */
	partner: optional(Person),
	task: optional(Id),
	note: optional(text(400))
});
const PracticeSet = z.strictObject({
	person: Person,
	callout: Callout,
	heads: whole(1, 200),
	stack: optional(Stack),
	limits: optional(Limits),
	note: optional(text(400))
});

// ---- driving and looking --------------------------------------------------------------------------------

const HolesDriven = z.strictObject({
	holes: Holes,
	method: Method,
	/** As used, which may not be what was planned. */
	callout: optional(Callout),
	setup: optional(Id),
	bag: optional(Id),
	sealant: optional(Id),
	bar: optional(text(60)),
	shooter: optional(Person),
	bucker: optional(Person),
	note: optional(text(400))
});
/** The bucker's word. */
const HolesLookedAt = z.strictObject({
	holes: Holes,
	by: Person,
	all: optional(z.boolean()),
	note: optional(text(400))
});
const HolesLeftOpen = z.strictObject({
	holes: Holes,
	reason: text(200),
	closedBy: optional(text(200))
});
const HolesDrilledOut = z.strictObject({
	holes: Holes,
	defect: optional(Id),
	reason: optional(text(200))
});
const ReadingTaken = z.strictObject({
	what: z.discriminatedUnion('is', [
		z.strictObject({ is: z.literal('hole'), by: optional(Id), index: whole(1, MOST_HOLES) }),
		z.strictObject({ is: z.literal('strip'), strip: Id, head: whole(1, 60) })
	]),
	found: Found,
	limits: optional(Limits),
	reader: optional(Person),
	drawn: optional(z.boolean()),
	note: optional(text(400))
});
const Fault = z.enum([
	'under_driven',
	'over_driven',
	'tipped',
	'off_centre',
	'smile',
	'gap',
	'sheets_apart',
	'cracked',
	'bent_over',
	'proud',
	'low',
	'enlarged_hole',
	'edge_short',
	'wrong_rivet',
	'loose',
	'other'
]);
const DefectNoted = z.strictObject({
	holes: Holes,
	fault: Fault,
	by: optional(Person),
	note: optional(text(2000))
});
/** Who decided, when it was not the author, and on what. No free text: names can be withdrawn, lines cannot. */
const decided = {
	decidedBy: optional(Person),
	basis: optional(z.enum(['drawings', 'manufacturer', 'authority', 'inspector', 'own_judgement']))
};
const DefectDecided = z.strictObject({
	defect: Id,
	holes: Holes,
	decision: z.enum(['leave', 'drive_further', 'replace', 'replace_oversize', 'refer', 'no_defect']),
	...decided,
	note: optional(text(2000))
});
const DefectFixed = z.strictObject({
	defect: Id,
	holes: Holes,
	action: z.enum(['left_as_is', 'driven_further', 'replaced', 'replaced_oversize', 'referred']),
	/** The new rivet's `holes.driven`, which stands on a `holes.drilled_out`. */
	rivet: optional(Id),
	...decided,
	note: optional(text(2000))
});

// ---- steps, closing, inspection -------------------------------------------------------------------------

const StepDone = z.strictObject({
	step: Id,
	value: optional(
		z.union([
			z.strictObject({ number: Decimal, unit: optional(text(16)) }),
			z.strictObject({ text: text(200) })
		])
	),
	note: optional(text(400))
});
const ClosingListed = z.strictObject({
	items: z
		.array(
			z.strictObject({
				what: text(120),
				is: z.enum(['yes', 'no', 'not_needed']),
				note: optional(text(200))
			})
		)
		.check(z.minLength(1), z.maxLength(60))
});
const WaiverGiven = z.strictObject({
	what: text(200),
	holes: optional(Holes),
	concerns: optional(Id),
	reason: text(2000)
});
const InspectionAsked = z.strictObject({
	seams: optional(z.array(Id).check(z.minLength(1), z.maxLength(500))),
	/** The head verified when it was asked: holes to gauge are drawn from it. */
	link: optional(z.strictObject({ seq: whole(0, Number.MAX_SAFE_INTEGER), link: Hash })),
	note: optional(text(2000))
});
/** A look at what came since an earlier verdict stands on that verdict: the envelope's `on` names it. */
const InspectionSigned = z.strictObject({
	verdict: z.enum(['in_order', 'in_order_with_remarks', 'rework', 'not_seen']),
	asked: optional(Id),
	/** The ids it covers and a digest over their bytes (see signoff.ts). */
	covers: z.array(Id).check(z.maxLength(5500)),
	digest: Hash,
	/** The head the signing device had verified. */
	link: z.strictObject({ seq: whole(0, Number.MAX_SAFE_INTEGER), link: Hash }),
	/** For an assembly: the sign-offs of its seams. */
	seams: optional(z.array(Id).check(z.maxLength(500))),
	name: text(80),
	certificate: optional(z.strictObject({ kind: text(80), number: optional(text(40)) })),
	statement: text(2000),
	remarks: optional(text(4000)),
	rework: optional(Holes),
	photosMissing: optional(z.array(Hash).check(z.maxLength(200))),
	unconfirmed: optional(z.boolean())
});
const InspectionConfirmed = z.strictObject({ signed: Id, means: z.enum(['password', 'passkey']) });
const InspectionRefused = z.strictObject({ asked: Id, reason: text(2000) });

// ---- words, pictures, hours, stock ----------------------------------------------------------------------

const NoteWritten = z.strictObject({
	text: text(4000),
	replyTo: optional(Id),
	mentions: optional(people),
	holes: optional(Holes),
	defect: optional(Id)
});
const file = {
	file: Hash,
	bytes: whole(1, 1_048_576),
	holes: optional(Holes),
	concerns: optional(Id),
	caption: optional(text(400))
};
const PhotoTaken = z.strictObject({
	...file,
	type: z.enum(['image/jpeg', 'image/webp', 'image/png']),
	width: whole(1, 20_000),
	height: whole(1, 20_000),
	of: optional(z.enum(['inside', 'head', 'seam', 'strip', 'other']))
});
const VoiceRecorded = z.strictObject({
	...file,
	type: z.enum(['audio/webm', 'audio/ogg', 'audio/mp4']),
	seconds: whole(0, 3600)
});
const TimeWorked = z.strictObject({
	people,
	day: Day,
	minutes: whole(0, 1440),
	from: optional(WallTime),
	to: optional(WallTime),
	note: optional(text(400))
});
const StockCounted = z.strictObject({
	callout: Callout,
	lot: optional(text(60)),
	/** Counted sets the number; bought and scrapped change it. */
	is: z.enum(['counted', 'bought', 'scrapped']),
	pieces: whole(0, 1_000_000),
	note: optional(text(400))
});

// ---- corrections ----------------------------------------------------------------------------------------

const EntryWithdrawn = z.strictObject({
	entry: Id,
	ground: z.enum(['owner', 'law']),
	note: optional(text(400))
});
const EntryStruck = z.strictObject({
	entry: Id,
	reason: z.enum(['undo', 'wrong_holes', 'wrong_seam', 'not_done', 'logged_twice', 'other']),
	/** Of a hole logged twice, the line that stays. */
	keeps: optional(Id),
	note: optional(text(400))
});

/** What the envelope must name: `seam` and `assembly` are for lines about one; `any` may name either, or neither. */
type Concerns = 'build' | 'assembly' | 'seam' | 'any';
type Writer = 'follower' | 'builder' | 'inspector' | 'owner' | 'inspector_or_owner' | 'server';

interface KindTraits {
	readonly body: z.core.$ZodType;
	readonly concerns: Concerns;
	/** Least role that may write it; `follower` means everybody in the crew. */
	readonly writer: Writer;
	/** A sign-off lists it, and one that arrives later makes the sign-off stale. */
	readonly material?: true;
	/** May be struck. Plans are changed or retired instead, crew lines answered by another crew line. */
	readonly strikable?: true;
	/** One of the states a hole can be in: its lines are heads of the holes they name. */
	readonly holds?: 'driven' | 'left_open' | 'drilled_out' | 'retired';
	/** Body keys that hold the id of another line, wherever in the build it stands. */
	readonly refers?: readonly string[];
	/** The same, where that line must concern what this one concerns: they are folded together. */
	readonly binds?: readonly string[];
}

const material = true;
const strikable = true;

export const KINDS = {
	'build.opened@1': { body: BuildOpened, concerns: 'build', writer: 'owner' },
	'build.described@1': { body: BuildDescribed, concerns: 'build', writer: 'builder', strikable },
	'crew.joined@1': { body: CrewJoined, concerns: 'build', writer: 'server' },
	'crew.role@1': { body: CrewRole, concerns: 'build', writer: 'server' },
	'crew.left@1': { body: CrewLeft, concerns: 'build', writer: 'server' },
	'crew.bound@1': { body: CrewBound, concerns: 'build', writer: 'server' },
	'owner.changed@1': { body: OwnerChanged, concerns: 'build', writer: 'server' },
	'device.enrolled@1': { body: DeviceEnrolled, concerns: 'build', writer: 'follower' },
	'person.named@1': { body: PersonNamed, concerns: 'build', writer: 'builder', strikable },
	'assembly.planned@1': {
		body: AssemblyPlanned,
		concerns: 'assembly',
		writer: 'builder',
		material
	},
	'assembly.changed@1': {
		body: AssemblyChanged,
		concerns: 'assembly',
		writer: 'builder',
		material,
		strikable
	},
	'assembly.closed@1': {
		body: AssemblyClosed,
		concerns: 'assembly',
		writer: 'inspector_or_owner',
		strikable
	},
	'assembly.reopened@1': {
		body: AssemblyReopened,
		concerns: 'assembly',
		writer: 'builder',
		strikable
	},
	'assembly.retired@1': {
		body: AssemblyRetired,
		concerns: 'assembly',
		writer: 'builder',
		material,
		strikable
	},
	'seam.planned@1': { body: SeamPlanned, concerns: 'seam', writer: 'builder', material },
	'seam.changed@1': { body: SeamChanged, concerns: 'seam', writer: 'builder', material, strikable },
	'seam.retired@1': { body: SeamRetired, concerns: 'seam', writer: 'builder', material, strikable },
	'holes.added@1': { body: HolesAdded, concerns: 'seam', writer: 'builder', material, strikable },
	'holes.retired@1': {
		body: HolesRetired,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable,
		holds: 'retired'
	},
	'setup.made@1': { body: SetupMade, concerns: 'any', writer: 'builder', material, strikable },
	'prep.done@1': { body: PrepDone, concerns: 'any', writer: 'builder', material, strikable },
	'sealant.mixed@1': {
		body: SealantMixed,
		concerns: 'any',
		writer: 'builder',
		material,
		strikable
	},
	'bag.opened@1': { body: BagOpened, concerns: 'any', writer: 'builder', material, strikable },
	'strip.shot@1': {
		body: StripShot,
		concerns: 'any',
		writer: 'builder',
		material,
		strikable,
		refers: ['setup']
	},
	'practice.logged@1': {
		body: PracticeLogged,
		concerns: 'build',
		writer: 'builder',
		strikable,
		refers: ['task', 'setup']
	},
	'practice.set@1': { body: PracticeSet, concerns: 'build', writer: 'builder', strikable },
	'holes.driven@1': {
		body: HolesDriven,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable,
		holds: 'driven',
		refers: ['setup', 'bag', 'sealant']
	},
	'holes.looked_at@1': {
		body: HolesLookedAt,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable
	},
	'holes.left_open@1': {
		body: HolesLeftOpen,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable,
		holds: 'left_open'
	},
	'holes.drilled_out@1': {
		body: HolesDrilledOut,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable,
		holds: 'drilled_out',
		binds: ['defect']
	},
	'reading.taken@1': {
		body: ReadingTaken,
		concerns: 'any',
		writer: 'builder',
		material,
		strikable
	},
	'defect.noted@1': { body: DefectNoted, concerns: 'seam', writer: 'builder', material, strikable },
	'defect.decided@1': {
		body: DefectDecided,
		concerns: 'seam',
		writer: 'inspector_or_owner',
		material,
		strikable,
		binds: ['defect']
	},
	'defect.fixed@1': {
		body: DefectFixed,
		concerns: 'seam',
		writer: 'builder',
		material,
		strikable,
		binds: ['defect', 'rivet']
	},
	'step.done@1': { body: StepDone, concerns: 'assembly', writer: 'builder', material, strikable },
	'closing.listed@1': {
		body: ClosingListed,
		concerns: 'assembly',
		writer: 'builder',
		material,
		strikable
	},
	'waiver.given@1': {
		body: WaiverGiven,
		concerns: 'any',
		writer: 'inspector_or_owner',
		material,
		strikable,
		refers: ['concerns']
	},
	'inspection.asked@1': { body: InspectionAsked, concerns: 'any', writer: 'builder', strikable },
	'inspection.signed@1': {
		body: InspectionSigned,
		concerns: 'any',
		writer: 'inspector',
		strikable,
		refers: ['asked']
	},
	'inspection.confirmed@1': {
		body: InspectionConfirmed,
		concerns: 'any',
		writer: 'server',
		refers: ['signed']
	},
	'inspection.refused@1': {
		body: InspectionRefused,
		concerns: 'any',
		writer: 'inspector_or_owner',
		strikable,
		refers: ['asked']
	},
	'note.written@1': {
		body: NoteWritten,
		concerns: 'any',
		writer: 'follower',
		strikable,
		refers: ['replyTo', 'defect']
	},
	'photo.taken@1': {
		body: PhotoTaken,
		concerns: 'any',
		writer: 'follower',
		material,
		strikable,
		refers: ['concerns']
	},
	'voice.recorded@1': {
		body: VoiceRecorded,
		concerns: 'any',
		writer: 'builder',
		strikable,
		refers: ['concerns']
	},
	'time.worked@1': { body: TimeWorked, concerns: 'any', writer: 'builder', strikable },
	'stock.counted@1': { body: StockCounted, concerns: 'build', writer: 'builder', strikable },
	'entry.withdrawn@1': {
		body: EntryWithdrawn,
		concerns: 'any',
		writer: 'owner',
		refers: ['entry']
	},
	'entry.struck@1': {
		body: EntryStruck,
		concerns: 'any',
		writer: 'follower',
		binds: ['entry', 'keeps']
	}
} as const satisfies Record<string, KindTraits>;

type KindAtVersion = keyof typeof KINDS;
type KindName<K extends string> = K extends `${infer Name}@${string}` ? Name : never;
export type Kind = KindName<KindAtVersion>;

/** The body of a kind, at its latest version. */
export type Body<K extends Kind> = z.output<(typeof KINDS)[`${K}@1`]['body']>;

export type HoleRange = z.output<typeof HoleRange>;
export type Holes = z.output<typeof Holes>;
export type Length = z.output<typeof Length>;
export type Sheet = z.output<typeof Stack>[number];
export type Prep = Sheet['prep'];
export type Method = z.output<typeof Method>;
export type Role = z.output<typeof Role>;
export type Fault = z.output<typeof Fault>;
export type SeamOverride = z.output<typeof Override>;
export const FAULTS: readonly Fault[] = Fault.options;
export const METHODS: readonly Method[] = Method.options;

/** The traits of a kind at a version, or undefined when this app does not know it. */
export function traits(kind: string, v: number): KindTraits | undefined {
	const key = `${kind}@${v}`;
	return Object.hasOwn(KINDS, key) ? KINDS[key as KindAtVersion] : undefined;
}

/** Does a sign-off hang on lines of this kind? A strike is as material as what it strikes. */
export function isMaterial(kind: string, v: number): boolean {
	return traits(kind, v)?.material === true;
}
