-- One state, as wrk sends it.
wrk.method = "POST"
wrk.headers["content-type"] = "application/json"
wrk.body = '{"system":{"mass_parameter":0.0121505856},"states":[{"position":[0.5,0.1,0.02],"velocity":[0.1,0.9,0.05]}]}'
