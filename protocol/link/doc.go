// Package link reads registers over one TCP connection per host and port, and trusts nothing that comes back.
//
// Start at [New], [Link.Unit] and [Unit.Read]. There is no method that writes, and the last code before the socket lets
// function codes 01 to 04 through and nothing else. This is the only package of the program that dials.
//
// A frame is the seven byte header of the MODBUS Messaging on TCP/IP Implementation Guide V1.0b, 3.1.3, and the protocol
// data unit of the MODBUS Application Protocol Specification V1.1b3, 4.1:
//
//	transaction 2 | protocol 2, always 0 | length 2, of all that follows | unit 1 | function 1 | data
//
// Encoding is github.com/goburrow/modbus's, under a transporter of our own, since that client's transporter never
// recovers from a late reply or a closed connection and takes any length of block as an answer. The rules here:
//
//   - One request in flight; those who wait are served in the order they came, so that units behind one gateway share it.
//   - Transaction identifiers cannot be foreseen. An answer must agree with its request in transaction, protocol, unit,
//     function, byte count and length, and nothing may follow it.
//   - A request that stays without one byte of answer keeps the connection: its identifier is remembered and the late
//     answer thrown away when it comes. The second silence in a row drops the connection.
//   - Anything else out of order is an error and drops the connection; there is no looking for the next frame.
//   - A connection that ended while it was idle is made anew and the request repeated once: reading twice does no harm.
//   - Failures in a row wait 100 ms, doubling to 10 s; meanwhile every request fails at once and says when the next try is.
//   - An exception is an answer: it keeps the connection.
package link
