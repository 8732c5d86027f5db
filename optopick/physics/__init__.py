"""The physics of an optocoupler link: pure functions in SI, on numbers or on arrays that broadcast.

Glossary (one meaning each, here and in every module behind):

=========  =====================================================================================================
`t`        ambient temperature [degC]; kelvin only inside formulas
`i_f`      LED current [A]; `i_eff`: the LED current that would give a new LED the same light, i_f times what
           ageing has left
`v_f`      LED forward voltage [V]
`ctr`      current transfer ratio, collector current over LED current [1], at the table's test current
`g`        CTR relative to the test current, over LED current [1]; `h`: the same over temperature [1]
`j`        collector current that the light could drive [A]: j = ctr * h * g(i_eff) * i_eff
`i_sat`    LED current that just carries the load: j(i_sat) = load current [A]
`i_be`     LED current whose light the base-emitter resistor takes away [A]
`eta`      base photocurrent per LED current, new LED [1]
`h_fe`     forward current gain [1]; the same transistor sets CTR, so h_fe = ctr * h * g / eta
`v_be`     base-emitter voltage in conduction [V]; `v_ce_sat`: collector-emitter voltage in saturation [V]
`tau`      time constant of the output's collector current [s]; `tau_s`: the storage constant [s]
=========  =====================================================================================================

Referring every current to the LED makes the transistor's falling gain cost nothing: light, load and base resistor are
compared before the gain, `i_eff - i_be` against `i_sat`, and the difference is linear in what each resistor
contributes.
"""
