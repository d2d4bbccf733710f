// Command chargehand commissions battery and supercapacitor tie-ins to a common DC bus.
package main

func main() {}
