// Package poll reads a device's signals at a steady pace and says what each reading is worth.
//
// Start at [New] and [Poller.Run]. What comes is a [signal.Batch] after every poll, also while the link is down: on
// [Poller.Batches] each one, kept until it is taken, for the owner of a walk; on [Poller.Latest] the newest only, for a
// screen. A batch always holds every signal of the map. A reading that is no newer than in the batch before has the same
// At; whoever collects samples takes a reading when its At moves.
//
// A reading is, in this order of judgement:
//
//	never    the device has not answered for it yet
//	bad      refused by the device, or it came and cannot be a value, or it may be torn
//	missing  the device's code for 'no value' came
//	stale    the link is down, or no newer answer came within max_age
//	frozen   the device answers but its image stands still
//	late     older than one and a half poll periods
//	good     otherwise
//
// Two clocks are at work. Link, pace and max_age go by real time, since they concern a real connection. Readings are stamped
// by the plant's clock, which in a rehearsal may run faster; Pace says how much.
//
// The device's own refresh shows in how the values change. Polls are dithered by a tenth of their period, without which a
// refresh close to a multiple of it would look regular and be wrong.
package poll
