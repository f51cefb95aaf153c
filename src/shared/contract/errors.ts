import { z } from 'zod'

/**
 * Permanent codes: never renamed, never reused. `title` says what happened, `remedy` what to do.
 * The HTTP status of each stands in server/errors.ts; DEVELOPERS.md lists all of them.
 */
export const ERRORS = {
  'request.invalid': {
    title: 'A field is not right.',
    remedy: 'Correct the field that is named and send it again.',
  },
  'request.malformed': { title: 'The request could not be read.', remedy: 'Send valid JSON.' },
  'request.too-large': { title: 'The request is too large.', remedy: 'Send less at once.' },
  'request.origin': {
    title: 'The request came from another site.',
    remedy: 'Open Evenstrung itself and try again.',
  },
  'route.unknown': { title: 'There is nothing at this address.', remedy: 'Check the address.' },
  'sign-in.wrong': {
    title: 'E-mail or password is wrong.',
    remedy: 'Try again; after several tries each one takes longer.',
  },
  'sign-in.wait': {
    title: 'Too many tries just now.',
    remedy: 'Wait for the seconds that are named, then try again.',
  },
  'sign-in.required': {
    title: 'You are not signed in.',
    remedy: 'Sign in; nothing that was stored is lost.',
  },
  'sign-in.reused': {
    title: 'This sign-in was used twice and has been ended for safety.',
    remedy: 'Sign in again.',
  },
  'invite.invalid': { title: 'This link was used or has run out.', remedy: 'Ask the admin for a new one.' },
  'password.weak': {
    title: 'The password is too short or too long.',
    remedy: 'Use 12 characters up to 72 bytes.',
  },
  'permission.denied': { title: 'Your role does not allow this.', remedy: 'Ask someone whose role does.' },
  'instrument.unknown': {
    title: 'No instrument has this serial.',
    remedy: 'Check the serial, or choose a model to start it.',
  },
  'instrument.model-differs': {
    title: 'This serial belongs to another model.',
    remedy: 'Check serial and model.',
  },
  'serial.invalid': {
    title: 'This is not a serial.',
    remedy: 'Use letters and digits only, 4 to 32 of them.',
  },
  'model.unknown': { title: 'There is no such model.', remedy: 'Choose one from the list.' },
  'sheet.none-in-force': {
    title: 'No threshold sheet is in force for this model.',
    remedy: 'Ask an engineer to put one in force.',
  },
  'bench.unknown': { title: 'There is no such bench.', remedy: 'Choose one from the list.' },
  'bench.offline': {
    title: 'The bench is not connected.',
    remedy: 'Switch the bench on, wait until it shows as ready.',
  },
  'bench.busy': {
    title: 'Another run is open on this bench.',
    remedy: 'Finish it there, or ask its opener or a lead to stop it.',
  },
  'bench.differs': {
    title: 'The bench is set up otherwise than when its run began.',
    remedy: 'Set it up as before, or let the opener or a lead stop the run.',
  },
  'bench.not-simulated': {
    title: 'This bench is a real one.',
    remedy: 'Only a simulated bench takes this command.',
  },
  'bench.token': {
    title: 'The bench token is not valid.',
    remedy: 'Enrol the bench again or set its new token.',
  },
  'bench.replaced': {
    title: 'A newer connection of this bench took over.',
    remedy: 'Stop the older program.',
  },
  'protocol.version': { title: 'This protocol version is not spoken here.', remedy: 'Use version 1.' },
  'protocol.hello-first': { title: 'The bench has not said hello.', remedy: 'Send bench:hello first.' },
  'protocol.message': {
    title: 'The message does not have the agreed shape.',
    remedy: 'Compare it with the schema.',
  },
  'protocol.unknown-event': { title: 'There is no such message.', remedy: 'Use a message of the protocol.' },
  'frames.in-flight': {
    title: 'A batch is still in flight.',
    remedy: 'Wait for its answer, then send the next.',
  },
  'frames.gap': {
    title: 'Frames are missing before this batch.',
    remedy: 'Send from the frame that is named.',
  },
  'frames.window': {
    title: 'The batch is larger than the window.',
    remedy: 'Send at most as many frames as the window says.',
  },
  'frames.foreign': {
    title: 'These frames belong to another run.',
    remedy: 'Send frames of the run that is open on this bench.',
  },
  'frames.channels': {
    title: 'The frame has another number of channels than the hello said.',
    remedy: 'Send one value for each channel.',
  },
  'frames.event-place': {
    title: 'An event names a frame outside its batch.',
    remedy: 'Send an event with the frame that it belongs to.',
  },
  'measure.high-voltage': {
    title: 'Insulation is measured here with at most 5 V.',
    remedy: 'High voltage is for loose jacks only.',
  },
  'run.unknown': { title: 'There is no such run.', remedy: 'Check the address.' },
  'run.serial-busy': {
    title: 'This serial is being checked just now.',
    remedy: 'Finish that check, or ask its opener or a lead to stop it.',
  },
  'run.not-open': { title: 'This run has ended.', remedy: 'Open its page to see how; nothing was changed.' },
  'run.action-not-now': {
    title: 'That does not fit this step of the check.',
    remedy: 'Follow the sentence on the screen.',
  },
  'run.not-yours': { title: 'Another person opened this run.', remedy: 'Ask them or a lead.' },
  'cautions.needed': {
    title: 'The cautions have not been read this shift.',
    remedy: 'Read and accept them first.',
  },
  'record.changed': {
    title: 'Someone else changed this meanwhile.',
    remedy: 'Look at the new state, then decide again.',
  },
  'record.exists': { title: 'There is already one with this name or number.', remedy: 'Choose another.' },
  'storage.away': {
    title: 'The database does not answer.',
    remedy: 'Wait; what is judged is kept and stored as soon as it is back.',
  },
  'server.error': {
    title: 'Something went wrong on our side.',
    remedy: 'Try again; if it stays, tell the admin the request id.',
  },
} as const

export type ErrorCode = keyof typeof ERRORS
export const ERROR_CODES = Object.keys(ERRORS) as ErrorCode[]

/** RFC 9457 body of every refusal, over HTTP and over sockets alike. */
export const Problem = z.object({
  type: z.string(),
  code: z.enum(ERROR_CODES as [ErrorCode, ...ErrorCode[]]),
  title: z.string(),
  remedy: z.string(),
  status: z.int(),
  detail: z.string().optional(),
  requestId: z.string().optional(),
  /** One entry for each field that is not right. */
  fields: z.array(z.object({ path: z.string(), message: z.string() })).optional(),
  /** Facts that the remedy needs: who and where, the frame wanted, seconds to wait. */
  facts: z.record(z.string(), z.union([z.string(), z.number(), z.boolean(), z.null()])).optional(),
})
export type Problem = z.infer<typeof Problem>
