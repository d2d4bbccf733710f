// Package measured holds a capture against its prediction: the measured findings and, where they differ, the ranked causes.
//
// Start at [Precharge], [Discharge] and [Droop]. [Rise] and [SoFar] judge a capture while it still runs.
//
// A prediction is a band, a measurement a value with an expanded uncertainty U = k·u, k from Student's t so that few points
// claim no more than they know. After the idea of JCGM 106:2012 (from memory) a value passes when it lies inside the band by
// U, fails when it lies outside by more than U, and is undecided in between: 'not capable' says that the measurement, not
// the plant, is what stands in the way. A capture that cannot be judged says why and gives no number.
//
// A cause is concluded from the signals of the capture and the site's figures alone. Causes that the signals at hand cannot
// tell apart stand side by side with equal score, and Confirm names the reading that parts them. A picture that fits none
// is 'not-known'.
package measured
