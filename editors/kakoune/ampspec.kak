# Ampspec files: file type and colours. The words come from the vocabulary: a test writes them.

hook global BufCreate .*\.ampspec %{ set-option buffer filetype ampspec }

add-highlighter shared/ampspec regions
add-highlighter shared/ampspec/code default-region group
add-highlighter shared/ampspec/text region '"' '"|$' fill string
add-highlighter shared/ampspec/comment region '#' '$' fill comment
# BEGIN WORDS
add-highlighter shared/ampspec/code/ regex '(?<![\w-])(across|across-load|air|all-channels|authorised|bank|base|because|below|board|both-emitters|both-halves|bridge|bridged|brushed|build|by|bypass|centre-tapped-total|channel|chassis|coil|common-emitter|compensation|complementary|compound-pair|cooler|crest|damp|dc|device|driver|drop|electrical|emitter|emitter-follower|enclosed|energy|error|esr|fast|from|from-rail|full|full-load|gap|grounded|height|held|high|horizontal|hot|idle|information|lateral|length|life|life-at|loaded|loop|lossy|low-mains|mains|mechanical|melts|minimum|nmos|no|no-load|nominal-mains|none|npn|ntc|of|on|one-channel|open|open-market|output|part|peak|per|pmos|pnp|primary|pulse|qty|rail|range|ref|release|ripple|secondary|sense|series|shunt|sink|slow|source-follower|speaker|stage|supply|surge|tap|tested|thermal-fuse|thick|to-base|touchable|transformer|typical|until|vertical|warning|watches|width|winding|yes)(?![\w-])' 1:attribute
add-highlighter shared/ampspec/code/ regex '(?:^|\{)\h*(allow|ambient|amplifier|angle|band|base|base-emitter|bleeder|board-reservoir|builds|change|channels|channels-per-board|coil|connection|contacts|crowbar|current|curve|cutout|dc|detector|detector-time|devices|driver|driver-rail|drop|duty|emitter|enclosure|endurance|fins|foster|fuse|gain|gate-drift|gate-source|gate-zener|heatsink|hfe|idle|insulator|junction|junction-case|limit-line|limiter|limiter-break|loads|mains|mass|minimum|muting|network|nominal|on-resistance|output|output-current|own-sink|pairs|parallel|part|plate|policy|power|predriver|primary|protection|rails|rated|rating|rectifier|regulation|relay|replace|reservoir|resistance|resistive|resonance|second-breakdown|secondary|sensor|severity|soa|soft-start|source|spread-across-sink|structure|supply|survives-short|switch|table|tail|terminals|thermal-fuse|touchable|transformer|transition|vbe|vbe-spread|vceo|vdss|vgs|voice-coil|voltage-amplifier|wiring|zobel)(?![\w-])' 1:variable
add-highlighter shared/ampspec/code/ regex '^(alternate|amplifier|ampspec|build|device|heatsink|load|network|policy|protection|stage|supply|transformer|use|waive)(?![\w-])' 1:keyword
# END WORDS
add-highlighter shared/ampspec/code/ regex '(?<![\w-])[+-]?\.?\d[^\s,}]*' 0:value

hook -group ampspec-highlight global WinSetOption filetype=ampspec %{
    add-highlighter window/ampspec ref ampspec
    hook -once -always window WinSetOption filetype=.* %{ remove-highlighter window/ampspec }
}
hook global BufSetOption filetype=ampspec %{
    set-option buffer comment_line '#'
    set-option buffer indentwidth 4
}
